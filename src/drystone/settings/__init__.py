"""Floor 1: the config, typed; nothing here reads a sheet or runs a step."""
