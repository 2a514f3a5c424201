"""What a unit will do once it is built: spread, alignment, drift, which part matters, how many to buy."""
