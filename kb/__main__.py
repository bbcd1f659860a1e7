"""`python -m kb` is the same as `sidepath`."""

from kb.cli.entry import main

if __name__ == "__main__":
    main()
