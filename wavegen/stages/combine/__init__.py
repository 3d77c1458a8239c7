"""Several signals to one."""
