"""What the program ends with; docs/cli.md says what each means."""

DONE = 0
ANSWER_IS_NO = 1
BAD_INPUT = 2
OUR_FAULT = 70
INTERRUPTED = 130
