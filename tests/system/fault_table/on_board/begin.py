"""`micropython begin.py PATH MODULE.py [ARGUMENTS]`: sets the search path, then runs a module's `main`."""

import sys


def main():
    sys.path[:0] = sys.argv[1].split(":")
    if sys.implementation.name != "micropython":
        import cpython_stand_ins

        cpython_stand_ins.install()
    __import__(sys.argv[2][:-3]).main()


if __name__ == "__main__":
    main()
