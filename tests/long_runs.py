"""Whether all is run that takes long, or as much of it as every change can wait for."""

import os

LONG = "SUBHARMONIC_LONG" in os.environ
