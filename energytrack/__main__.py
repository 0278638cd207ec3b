"""`python -m energytrack`."""

from energytrack.cli.app import main

if __name__ == "__main__":  # worker processes import this file too
    main()
