"""Exit statuses, the one place that says what they mean."""

DONE = 0
REFUSED = 1
BAD_INPUT = 2
FAULT = 3
STOPPED = 130  # what shells use for a command ended by Ctrl-C
PIPE_CLOSED = 141  # what shells use for a command whose reader went away

HELP = (
    "Exit status: 0 done; 1 done, but rows or sightlines were refused (they are listed); "
    "2 bad input, nothing written; 3 a fault of this program; 130 stopped by Ctrl-C."
)

PAGES = "Exit status: 0 done; 2 bad input, nothing written; 3 a fault of this program; 130 stopped by Ctrl-C."
