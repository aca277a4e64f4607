/*
 * The least that any host can do: reads the line and, for every second edge frame (the rises),
 * writes a reply as long as a pulse frame. No checks, no thought: the floor to compare with.
 *
 * usage: echo PTY
 */
#include <fcntl.h>
#include <string.h>
#include <unistd.h>

enum { EDGE = 0x03, PULSE_BYTES = 40 };

int main(int argc, char **argv) {
  if (argc != 2) return 2;
  int line = open(argv[1], O_RDWR | O_NOCTTY);
  unsigned char bytes[4096], reply[PULSE_BYTES];
  memset(reply, 0x55, sizeof reply);
  reply[PULSE_BYTES - 1] = 0;
  int place = 0, edges = 0;
  for (;;) {
    int got = read(line, bytes, sizeof bytes);
    if (got <= 0) return 0;
    for (int i = 0; i < got; i++) {
      /* The type byte is never 0, so it always stands second in a stuffed frame. */
      if (bytes[i] == 0) place = 0;
      else if (++place == 2 && bytes[i] == EDGE && ++edges % 2 == 1) {
        if (write(line, reply, sizeof reply) < 0) return 1;
      }
    }
  }
}
