/*
 * The board's end of a pseudo-terminal, for measuring round trips. Open loop: frames go out on a
 * schedule, whatever comes back and when. A sample every millisecond; half-way between two samples,
 * every 10 ms, an input rises (the cause of a reply), and falls 2 ms later.
 *
 * usage: peer bare|board INPUT
 *   bare   every frame that comes back is the reply to the oldest cause not yet answered
 *   board  speaks the wire: answers identify, takes pulses, tells their outcomes; a pulse answers
 *          the cause whose stamp lies a constant window before the pulse's expiry. The belt runs at
 *          one count a millisecond, and its mark passes the seam sensor every LAP counts
 *
 * Out: `pty PATH`, then `identified` at each handshake. In: `block CAUSES`. Out for each block: a
 * line `rtt NS` for each cause (-1: never answered), then `end DROPPED UNMATCHED`.
 */
#define _GNU_SOURCE
#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/timerfd.h>
#include <termios.h>
#include <time.h>
#include <unistd.h>

enum { IDENTITY = 0x01, SAMPLE = 0x02, EDGE = 0x03, OUTCOME = 0x04, CLOCK = 0x06 };
enum { IDENTIFY = 0x41, PULSE = 0x43, ARM = 0x44 };
enum { FIRED = 1, DONE = 2, REFUSED = 6, BAD_SLOT = 8 };
/* Ticks of 500 us: samples on the even ones, edges on odd ones of a cycle of 10 ms. */
enum { TICK_NS = 500000, CYCLE = 20, RISE_AT = 1, FALL_AT = 5, IDLE_EVERY = 10 };
/* Only pulses on this output are replies. */
enum { REPLY_OUTPUT = 4 };
enum { SEAM_INPUT = 1, LAP = 4500, MARK = 10 };
enum { MOST_CAUSES = 1 << 20, PENDING = 64, GRACE_TICKS = 400 };

struct cause { uint32_t stamp; int64_t sent, rtt; };
static struct cause *causes;
static int asked, sent, oldest, dropped, unmatched;
static int master, bare, input;
static uint16_t tag;
static uint8_t sequence;
static int64_t zero;
/* The mark comes a second after the first handshake: causes wait for it, for a known position. */
static int32_t count = LAP - 1000;
static int marked;
static int level, seam;
static uint32_t window;
static struct { uint32_t id, at, width; uint8_t output; int on; } pending[PENDING];

static int64_t now_ns(void) {
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return t.tv_sec * 1000000000LL + t.tv_nsec;
}
static uint32_t board_us(void) { return (uint32_t)((now_ns() - zero) / 1000); }

static uint16_t crc16(const uint8_t *bytes, int length) {
  uint16_t crc = 0xffff;
  for (int i = 0; i < length; i++) {
    crc ^= (uint16_t)(bytes[i] << 8);
    for (int bit = 0; bit < 8; bit++) crc = crc & 0x8000 ? (crc << 1) ^ 0x1021 : crc << 1;
  }
  return crc;
}

static uint8_t frame[80];
static int used;
static void begin(int type) {
  frame[0] = type;
  frame[1] = sequence++;
  frame[2] = tag & 0xff;
  frame[3] = tag >> 8;
  used = 4;
}
static void put(uint32_t value, int bytes) {
  while (bytes-- > 0) {
    frame[used++] = value & 0xff;
    value >>= 8;
  }
}
static void finish(void) {
  uint16_t crc = crc16(frame, used);
  put(crc, 2);
  uint8_t out[96];
  int code = 0, at = 1;
  for (int i = 0; i < used; i++) {
    if (frame[i] != 0) {
      out[at++] = frame[i];
    } else {
      out[code] = at - code;
      code = at++;
    }
  }
  out[code] = at - code;
  out[at++] = 0;
  /* A full pseudo-terminal loses the frame, as a full line would. */
  if (write(master, out, at) != at) dropped++;
}

static uint32_t get(const uint8_t *p, int bytes) {
  uint32_t value = 0;
  while (bytes-- > 0) value = value << 8 | p[bytes];
  return value;
}

static void say_outcome(uint32_t id, int kind, int reason, int output, uint32_t at, uint32_t on) {
  begin(OUTCOME);
  put(id, 4), put(kind, 1), put(reason, 1), put(output, 1), put(0, 1);
  put(at, 4), put(count, 4), put(on, 4);
  finish();
}

static void identify(const uint8_t *payload) {
  uint16_t previous = tag;
  tag = get(payload + 5, 2);
  sequence = 0;
  begin(IDENTITY);
  put(get(payload, 4), 4), put(payload[4], 1), put(1, 2);
  put(0xbe7c, 4), put(1, 4), put(previous, 2), put(1, 2);
  put(8, 1), put(8, 1), put(0, 1), put(0, 1);
  put(board_us(), 4), put(0, 2), put(1, 1);
  memset(frame + used, 0, 16);
  memcpy(frame + used, "bench", 5);
  used += 16;
  finish();
  printf("identified\n");
  fflush(stdout);
}

static void pulse(const uint8_t *payload, int64_t at_ns) {
  uint32_t id = get(payload, 4), width = get(payload + 6, 4), expiry = get(payload + 20, 4);
  if (sent > 0 && payload[4] == REPLY_OUTPUT) {
    /* The window is a constant; a late reply makes it look smaller, never greater. */
    uint32_t seen = expiry - causes[sent - 1].stamp;
    if (seen < 0x80000000u && seen > window) window = seen;
    int i = sent - 1;
    while (i >= 0 && causes[i].stamp + window != expiry) i--;
    if (i < 0 || causes[i].rtt >= 0) unmatched++;
    else causes[i].rtt = at_ns - causes[i].sent;
  }
  uint32_t at = board_us();
  say_outcome(id, FIRED, 0, payload[4], at, 0);
  for (int i = 0; i < PENDING; i++) {
    if (pending[i].on) continue;
    pending[i].id = id, pending[i].at = at, pending[i].width = width;
    pending[i].output = payload[4], pending[i].on = 1;
    break;
  }
}

static void reply(int64_t at_ns) {
  if (oldest >= sent) unmatched++;
  else causes[oldest].rtt = at_ns - causes[oldest].sent, oldest++;
}

static void received(uint8_t *stuffed, int length, int64_t at_ns) {
  if (bare) {
    reply(at_ns);
    return;
  }
  uint8_t raw[96];
  int read = 0, size = 0;
  while (read < length) {
    int code = stuffed[read++];
    for (int i = 1; i < code && read < length; i++) raw[size++] = stuffed[read++];
    if (code != 0xff && read < length) raw[size++] = 0;
  }
  if (size < 6 || get(raw + size - 2, 2) != crc16(raw, size - 2)) return;
  if (raw[0] == IDENTIFY) identify(raw + 4);
  else if (get(raw + 2, 2) != tag) return;
  else if (raw[0] == PULSE) pulse(raw + 4, at_ns);
  else if (raw[0] == ARM) say_outcome(get(raw + 4, 4), REFUSED, BAD_SLOT, raw[9], board_us(), 0);
}

static void take_bytes(void) {
  static uint8_t stuffed[96];
  static int length;
  uint8_t bytes[4096];
  int got = read(master, bytes, sizeof bytes);
  int64_t at_ns = now_ns();
  for (int i = 0; i < got; i++) {
    if (bytes[i] != 0) {
      if (length < (int)sizeof stuffed) stuffed[length++] = bytes[i];
    } else {
      if (length > 0) received(stuffed, length, at_ns);
      length = 0;
    }
  }
}

static void say_sample(void) {
  uint32_t at = board_us();
  int outputs = 0;
  for (int i = 0; i < PENDING; i++) {
    if (!pending[i].on) continue;
    if (at - pending[i].at >= pending[i].width) {
      pending[i].on = 0;
      uint32_t fall = pending[i].at + pending[i].width;
      say_outcome(pending[i].id, DONE, 0, pending[i].output, fall, pending[i].width);
    } else {
      outputs |= 1 << pending[i].output;
    }
  }
  begin(SAMPLE);
  put(at, 4), put(count, 4), put(level << input | seam << SEAM_INPUT, 2), put(outputs, 2);
  put(0, 2), put(0, 1), put(0, 1);
  finish();
}

static void say_seam(int to) {
  seam = to;
  begin(EDGE);
  put(board_us(), 4), put(count, 4), put(SEAM_INPUT, 1), put(to, 1);
  finish();
}

static void run_belt(int counts) {
  while (counts-- > 0) {
    count++;
    if (bare) continue;
    if (count % LAP == 0) say_seam(1), marked = 1;
    if (count % LAP == MARK) say_seam(0);
  }
}

static void say_edge(int to) {
  level = to;
  struct cause *cause = &causes[sent];
  uint32_t at = board_us();
  begin(EDGE);
  put(at, 4), put(count, 4), put(input, 1), put(to, 1);
  if (to) {
    cause->stamp = at;
    cause->rtt = -1;
    cause->sent = now_ns();
    sent++;
  }
  finish();
}

/* One tick of a block or of the idle time between blocks; true when the block is over. */
static int tick(int64_t n) {
  static int grace;
  int place = n % CYCLE;
  if (!bare && tag == 0) return 0;
  if (!bare && n % 2000 == 0) {
    begin(CLOCK);
    put(board_us(), 4), put(0, 2);
    finish();
  }
  if (asked == 0) {
    /* Between blocks a board must not fall silent; a bare echo may. */
    if (!bare && n % IDLE_EVERY == 0) run_belt(IDLE_EVERY / 2), say_sample();
    return 0;
  }
  if (n % 2 == 0) {
    run_belt(1);
    say_sample();
  } else if (place == RISE_AT && sent < asked && level == 0 && (bare || marked)) {
    say_edge(1);
  } else if (place == FALL_AT && level == 1) {
    say_edge(0);
  }
  if (sent < asked || level == 1) {
    grace = 0;
    return 0;
  }
  return ++grace > GRACE_TICKS;
}

static void report(void) {
  for (int i = 0; i < sent; i++) printf("rtt %lld\n", (long long)causes[i].rtt);
  printf("end %d %d\n", dropped, unmatched);
  fflush(stdout);
  asked = sent = oldest = dropped = unmatched = 0;
}

static int take_command(void) {
  char line[64] = {0};
  int got = read(0, line, sizeof line - 1);
  if (got <= 0) return 0;
  int causes_wanted;
  if (sscanf(line, "block %d", &causes_wanted) == 1 && causes_wanted < MOST_CAUSES) {
    asked = causes_wanted;
    sent = oldest = dropped = unmatched = 0;
  }
  return 1;
}

int main(int argc, char **argv) {
  if (argc != 3) return 2;
  bare = strcmp(argv[1], "bare") == 0;
  input = atoi(argv[2]);
  causes = calloc(MOST_CAUSES, sizeof *causes);
  master = posix_openpt(O_RDWR | O_NOCTTY | O_NONBLOCK);
  grantpt(master);
  unlockpt(master);
  /* Held open, so that one host may leave and the next one come. */
  int slave = open(ptsname(master), O_RDWR | O_NOCTTY);
  struct termios line;
  tcgetattr(slave, &line);
  cfmakeraw(&line);
  tcsetattr(slave, TCSANOW, &line);
  printf("pty %s\n", ptsname(master));
  fflush(stdout);
  zero = now_ns();
  int timer = timerfd_create(CLOCK_MONOTONIC, TFD_NONBLOCK);
  struct itimerspec every = {{0, TICK_NS}, {0, TICK_NS}};
  timerfd_settime(timer, 0, &every, 0);
  struct pollfd waits[3] = {{master, POLLIN, 0}, {timer, POLLIN, 0}, {0, POLLIN, 0}};
  int64_t n = 0;
  for (;;) {
    if (poll(waits, 3, -1) < 0 && errno != EINTR) return 1;
    if (waits[0].revents & POLLIN) take_bytes();
    if (waits[2].revents != 0 && !take_command()) return 0;
    uint64_t expired = 0;
    if (waits[1].revents && read(timer, &expired, 8) == 8) {
      /* Ticks missed by a stalled peer are made up for at once: the schedule does not wait. */
      while (expired-- > 0) {
        if (tick(n++)) report();
      }
    }
  }
}
