"""`python -m tangentbook`."""

from tangentbook.cli import main

if __name__ == "__main__":
    main()
