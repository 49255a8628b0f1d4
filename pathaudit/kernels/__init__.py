"""Arrays in, arrays out: the numerical work, with no models and no files."""
