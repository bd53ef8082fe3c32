"""`python -m prover` is the command `subharmonic`."""

from prover.cli import main

if __name__ == "__main__":
    main()
