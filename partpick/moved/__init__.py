"""What a tuning element that moves inductance makes of each coil: sliding core, moving contact, variometer."""
