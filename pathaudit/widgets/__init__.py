"""An audit on show in a notebook."""
