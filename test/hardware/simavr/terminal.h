/*
 * The chip behind a pseudo-terminal at wall-clock speed, for smoke tests of whole processes.
 * Bytes sent while nobody has the port open are lost, as on a wire.
 */
#ifndef TERMINAL_H
#define TERMINAL_H

/* Prints `pty PATH`, then runs until standard input ends. Returns the exit code. */
int terminal_serve(void);

#endif
