"""`python -m benchmarks` is the command `pulsewright`."""

from benchmarks.command_line import main

if __name__ == "__main__":
    main()
