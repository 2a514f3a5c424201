"""Winding forms: how formers, cores and wires become coils. The table of forms is in `candidates.py`."""
