"""``python -m viewer`` is ``hingelight``."""

from viewer.cli import main

if __name__ == "__main__":
    main()
