"""Steel that holds a pipe: sections and the brackets made of them; knows nothing of pipes."""
