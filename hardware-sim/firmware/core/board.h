/*
 * The portable core: everything that WIRE.md asks of a board and that is not a register.
 *
 * Three contexts run it. The encoder's interrupt moves the count and raises the output of a slot
 * (avr/encoder.S). The service, an interrupt with interrupts on, keeps the books of
 * the outputs (outputs.c). The main loop obeys the host and talks (commands.c, voice.c); it holds
 * the service off while it touches the outputs. See layer.h for what a board's layer must give.
 */
#ifndef LAPWING_BOARD_H
#define LAPWING_BOARD_H
#include <stdbool.h>
#include <stdint.h>
#include "wire.h"
#include "layer.h"

typedef uint8_t mask_t; /* a bit for each output */
#define BIT(n) ((mask_t)(1u << (n)))

/* ---- slots.c: what is armed, two lists in the order in which the count will come to them. */
typedef struct slot {
  /* What the encoder's interrupt works with: avr/encoder.S knows this layout. */
  int32_t target;
  mask_t fast;          /* the output's bit while this slot would pass every check; else 0 */
  volatile mask_t rose; /* set at the hit: the interrupt has raised the output */
  volatile uint16_t hit_ticks;
  struct slot *volatile next;
} slot_t;
typedef struct {
  uint32_t id;
  shape_t shape;
  uint8_t output : 4, rising : 1, armed : 1;
} order_t;
extern slot_t slots[N_SLOTS + 1]; /* the last stands at the end of both lists */
extern order_t orders[N_SLOTS];   /* what each is to do */
extern slot_t *volatile slot_heads[2];     /* falling, rising: the next target in each direction */
extern volatile uint8_t slot_head_lows[2]; /* the low byte of its target */
extern slot_t *slot_heads_known[2];        /* what was hit lies between these and the heads */

void slots_begin(void);
void slots_book_hits(void);
static inline bool slots_hit_waiting(void) {
  return slot_heads_known[0] != slot_heads[0] || slot_heads_known[1] != slot_heads[1];
}
static inline void slots_take_hits(void) {
  if (slots_hit_waiting()) slots_book_hits();
}
bool slot_arm(uint8_t n);
void slot_disarm(uint8_t n, uint8_t kind, uint8_t reason);
void slots_end(uint32_t keep, uint16_t outputs, uint8_t reason);
void slots_sweep(void);
bool slots_share_low_byte(int32_t target);
mask_t slots_armed_outputs(void);
void slots_refresh_fast(uint8_t output);
bool slots_have(uint32_t id);

/* ---- falls.c: the falls ahead, which the timer's interrupt makes by itself. */
typedef struct fall {
  /* avr/service.S knows this layout. */
  volatile uint16_t ticks; /* when; once it is made, when that was */
  mask_t mask;             /* which outputs; 0: this one is free */
  volatile uint8_t made;   /* set by the interrupt, which has taken it out of the list */
  struct fall *next;
  uint8_t spread; /* how much earlier the first of them would have been due */
} fall_t;
extern fall_t falls[N_OUTPUTS + 1];
extern fall_t *volatile falls_head;
extern mask_t falls_known; /* outputs whose fall is in the list, or made and not taken back */
void falls_begin(void);
void falls_add(uint8_t n, uint16_t ticks);
void falls_cancel(uint8_t n);
mask_t falls_take(uint16_t *ticks);
void falls_wake(uint16_t ticks);

/* ---- outputs.c: owners, limits, pulses, trains, sync trains. Times are board microseconds. */
enum { ON = 1, COMMAND = 2, SYNC = 4, FINISH = 8, FELL = 16, ROSE = 32, TAKEN = 64 };
typedef struct {
  uint32_t longest_on_us; /* 0: not configured, never on */
  uint32_t least_gap_us, allowance_us, least_counts;
  uint16_t allowance_rises;
  uint8_t flags;
  uint8_t ending; /* why the owner's end was brought forward */
  union {
    struct { uint32_t id, on_us, period_us; } command;
    struct { uint32_t random, least_wait_us, most_wait_us; } sync;
  } own;
  uint32_t width_us;
  uint16_t left;    /* pulses of the train still to rise */
  uint16_t late_us; /* how late the last rise of the train was: the next is not */
  uint32_t rise_us; /* a sync train that is off: when its wait began */
  uint32_t span_us; /* on: the cut-off; a sync train that is off: its wait */
  uint32_t fall_us;
  int32_t first_rise_count;
} output_t;
extern output_t outputs[N_OUTPUTS];

extern volatile uint8_t bank_held, bank_wanted; /* by whom it may be run is in outputs.c */
void bank_service(void);
void bank_hold(void);
void bank_release(void);
void bank_release_unchanged(void);
uint8_t output_shape_reason(const output_t *line, const shape_t *shape);
bool output_slot_fast(int32_t target, const order_t *order);
/* When and where a pulse may first rise: the part of it that is looked at again then. */
typedef struct PACKED { uint8_t flags; uint32_t start_us; int32_t count_from, count_to; } window_t;
void bank_rise(uint32_t id, uint8_t n, const shape_t *shape, const window_t *window);
void bank_rise_hit(const slot_t *slot, const order_t *order);
void bank_stop(uint8_t n, uint8_t reason);
void bank_end_all(uint16_t mask, uint8_t reason);
void bank_end_for_silence(uint8_t reason);
void output_configure(const configure_t *message);
void bank_unconfigure(void);
void output_sync(const sync_t *message);
void bank_forget_old_falls(void);

/* ---- waiting.c: pulses whose start is still ahead. */
typedef struct PACKED {
  uint32_t id;
  uint8_t output;
  shape_t shape;
  window_t window;
  uint16_t order;
} waiting_t;
bool waiting_add(const pulse_t *pulse, uint32_t start_us);
bool waiting_rise_due(uint32_t now_us);
uint32_t waiting_next_us(uint32_t now_us);
void waiting_end(uint16_t mask, uint8_t reason);
bool waiting_has(uint32_t id);

/* ---- commands.c: what the host says; silence; ids. */
extern uint16_t tag, previous_tag;
void command_obey(uint8_t type, uint16_t frame_tag, const void *payload);
uint8_t command_payload_bytes(uint8_t type);
void command_tick(void);
extern volatile uint8_t host_fresh; /* a beat of less than 150 ms age has come: outputs may be fed */

/* ---- voice.c: what the board says. */
void voice_outcome(uint32_t id, uint8_t kind, uint8_t reason, uint8_t output, uint32_t us,
                   int32_t count, uint32_t on_us);
void voice_outcome_now(uint32_t id, uint8_t kind, uint8_t reason, uint8_t output);
bool voice_repeat(uint32_t id);
typedef struct { uint32_t us; int32_t count; uint8_t what; } edge_t; /* SYNC_EDGE, number << 1, level */
extern edge_t edges[N_EDGES];
extern volatile uint8_t edges_in, edges_out;

/*
 * False: there is no room; whoever saw the edge sees it again later. Written into its callers, like
 * `board_inputs`: they are interrupts, and calls cost them stack.
 */
static inline __attribute__((always_inline)) bool voice_edge(uint8_t input, uint8_t level,
                                                             uint32_t us, int32_t count) {
  bool room = false;
  hal_irq_off();
  uint8_t in = edges_in, next = (uint8_t)(in + 1 == N_EDGES ? 0 : in + 1);
  if (next != edges_out) {
    edge_t *edge = &edges[in];
    edge->us = us;
    edge->count = count;
    edge->what = (uint8_t)((input & SYNC_EDGE) | (input & 0x0f) << 1 | level);
    edges_in = next;
    room = true;
  }
  hal_irq_on();
  return room;
}

void voice_fault(uint8_t fault, uint32_t detail);
void voice_identity(uint32_t nonce);
void voice_refuse_identify(uint32_t nonce, uint16_t asker, uint8_t protocol);
void voice_boot(void);
void voice_tick(void);
bool voice_speak(void);
bool voice_caught_up(void);
extern volatile uint8_t bad_frames, overruns;

/* ---- frames.c: COBS and CRC, both ways. */
extern volatile uint8_t tx_ring[TX_BYTES], tx_head, tx_tail;
bool frame_open(uint8_t type, uint16_t frame_tag, uint8_t payload_bytes);
void frame_restart(void);
void frame_8(uint8_t value);
void frame_16(uint16_t value);
void frame_32(uint32_t value);
void frame_close(void);
void frame_byte(uint8_t byte);

/* ---- random.c */
uint32_t xorshift32(uint32_t *state);
uint32_t scaled(uint32_t x, uint32_t least, uint32_t most);

/* ---- board.c: the main loop's round, the 1 kHz tick, and what identity tells. */
extern uint32_t boot_id, board_id;
extern uint8_t reset_cause;
void board_begin(void);
bool board_round(void);
void board_tick(void);

/* What the inputs are now; a change that finds no room to be told is seen again at the next tick. */
static inline __attribute__((always_inline)) void board_inputs(uint8_t levels, uint32_t us,
                                                               int32_t count) {
  uint8_t changed = levels ^ (uint8_t)hal_input_levels, bit = 1;
  for (uint8_t n = 0; changed; n++, changed >>= 1, levels >>= 1, bit <<= 1) {
    if ((changed & 1) && voice_edge(n, levels & 1, us, count)) hal_input_levels ^= bit;
  }
}
#endif
