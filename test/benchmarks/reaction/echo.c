/* The peer: opens a terminal and sends back whatever comes, line by line, as fast as C can. */
#define _GNU_SOURCE
#include <fcntl.h>
#include <signal.h>
#include <string.h>
#include <sys/prctl.h>
#include <termios.h>
#include <unistd.h>

int main(int argc, char **argv) {
  if (argc != 2) return 2;
  prctl(PR_SET_PDEATHSIG, SIGKILL);
  int terminal = open(argv[1], O_RDWR | O_NOCTTY);
  struct termios t;
  if (terminal < 0 || tcgetattr(terminal, &t) != 0) return 1;
  cfmakeraw(&t);
  tcsetattr(terminal, TCSANOW, &t);
  char bytes[4096];
  size_t length = 0;
  for (;;) {
    ssize_t n = read(terminal, bytes + length, sizeof bytes - length);
    if (n <= 0) return 0;
    length += (size_t)n;
    char *end = memrchr(bytes, '\n', length);
    size_t whole = end == 0 ? 0 : (size_t)(end - bytes) + 1;
    if (whole > 0 && write(terminal, bytes, whole) != (ssize_t)whole) return 1;
    length -= whole;
    memmove(bytes, bytes + whole, length);
    if (length == sizeof bytes) length = 0;
  }
}
