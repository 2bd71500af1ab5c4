"""Compiled inner loops.  Arrays and scalars in, arrays and scalars out; nothing here knows what a puncture is."""
