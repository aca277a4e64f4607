/* The numbers of server/wire/WIRE.md, and its host messages as they lie in a frame. */
#ifndef LAPWING_WIRE_H
#define LAPWING_WIRE_H
#include <stdint.h>

#define PROTOCOL_VERSION 1
#define FIRMWARE_VERSION 1
#define FRAME_MOST 64 /* before stuffing */

enum { M_IDENTITY = 0x01, M_SAMPLE, M_EDGE, M_OUTCOME, M_FAULT, M_CLOCK };
enum { M_IDENTIFY = 0x41, M_CONFIGURE, M_PULSE, M_ARM, M_QUIET, M_BEAT, M_SYNC };

enum { FIRED = 1, DONE, DISARMED, EXPIRED, PASSED, REFUSED };

enum {
  R_NONE, R_BUSY, R_LEAST_GAP, R_LEAST_COUNTS, R_ALLOWANCE, R_LONGEST_ON, R_NOT_CONFIGURED,
  R_COUNT_WINDOW, R_BAD_SLOT, R_SLOT_TAKEN, R_BAD_SHAPE, R_OLD_ID, R_BAD_EXPIRY,
  R_SHARED_LOW_BYTE, R_SILENCE, R_CUT, R_UNWANTED, R_NEW_TAG
};

enum {
  F_WATCHDOG_SLOTS = 1, F_WATCHDOG_OUTPUTS, F_QUEUE_FULL, F_WRONG_TAG, F_BAD_PROTOCOL,
  F_BROWN_OUT, F_SYNC_REFUSED
};

enum { RESET_UNKNOWN, RESET_POWER_ON, RESET_PIN, RESET_BROWN_OUT, RESET_WATCHDOG, RESET_SOFTWARE };

#define CAPABILITY_SLOTS 2
#define CAPABILITY_SYNC 4
#define IDLE_HIGH 1
#define FINISH_ON_SILENCE 2
#define START_AT 1
#define COUNT_WINDOW 2
#define SYNC_EDGE 0x80

#define SAMPLE_MOST_TICKS 5
#define CLOCK_TICKS 1000
#define SLOT_SILENCE_US 150000UL
#define OUTPUT_SILENCE_US 250000UL
#define EXPIRY_MOST_US 10000000L
#define WRONG_TAG_EVERY_US 100000UL

/* Payloads as they come: little-endian, unaligned. */
#define PACKED __attribute__((packed))
typedef struct PACKED { uint32_t width_us, period_us; uint16_t repeats; } shape_t;
typedef struct PACKED { uint32_t nonce; uint8_t protocol; uint16_t new_tag; } identify_t;
typedef struct PACKED {
  uint8_t output, flags;
  uint32_t longest_on_us, least_gap_us, allowance_us;
  uint16_t allowance_rises;
  uint32_t least_counts;
} configure_t;
typedef struct PACKED {
  uint32_t id;
  uint8_t output, flags;
  shape_t shape;
  uint32_t start_us, expiry_us;
  int32_t count_from, count_to;
} pulse_t;
typedef struct PACKED {
  uint32_t id;
  uint8_t slot, output, rising;
  int32_t count;
  shape_t shape;
} arm_t;
typedef struct PACKED { uint16_t outputs; } quiet_t;
typedef struct PACKED { uint32_t finished_us, wanted; } beat_t;
typedef struct PACKED {
  uint8_t output, running;
  uint32_t width_us, least_gap_us, most_gap_us, seed;
} sync_t;
#endif
