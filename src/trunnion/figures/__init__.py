"""Every picture, one look. matplotlib is imported here and nowhere else."""
