"""The command line: parse, call, print.

In: words typed by an observer. Out: files in a folder, a short table on stdout, messages and
progress on stderr, an exit status (0 done, 1 no plan, 2 bad input). No science happens here; heavy
libraries are imported inside the commands, so that help is instant.
"""
