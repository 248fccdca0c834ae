"""What all tests share. Being here puts this folder on the path, so that helpers can be imported."""
