"""Goals, one small file each."""
