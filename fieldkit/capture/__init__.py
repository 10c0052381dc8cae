"""Live capture: from the input of the machine to a recording that survives what goes wrong."""
