"""One party's convention to the other's: readings of three numbers, reference attitudes, identification."""
