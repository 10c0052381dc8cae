"""The pipe span as a structure: layout, elements, modes, statics. Blind to signals."""
