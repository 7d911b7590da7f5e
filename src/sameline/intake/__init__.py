"""Files and forms in, checked runs out."""
