"""`python -m energytrack`."""

from energytrack.cli.app import main

main()
