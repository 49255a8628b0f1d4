"""An audit as text, tables, files and pictures. Nothing is computed here that a verdict rests on."""
