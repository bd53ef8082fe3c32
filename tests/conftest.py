"""Here so that this folder is on the import path of every test below it, tests/agreement among them."""
