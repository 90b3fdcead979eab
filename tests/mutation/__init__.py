"""Who checks the checker: terms of its arithmetic are altered one at a time, and somebody must notice.

    python -m tests.mutation ROOM COUNT SEED      one room: slope_deflection, moment_distribution, library, audit, compare
    python -m tests.mutation all                  every room with the counts and seeds of rooms.py

alter    finds the terms and alters them: sign, factor, index, swapped ends
patch    puts one altered function into the running process, in memory alone
rooms    which files are altered, who must notice, and what is known to change nothing
run      one forked process a mutant: the comparison on cases/ first, then the sharp part of the test suite

Nothing is written into the working tree. It needs an operating system that can fork (Linux, macOS).
"""
