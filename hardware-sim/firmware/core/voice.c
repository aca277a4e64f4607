/*
 * What the board says. Outcomes wait in the ring in which they are kept, edges and faults in short
 * queues; the earliest goes first. A sample goes only when nothing else waits, and is made then.
 */
#include "board.h"

typedef struct {
  uint32_t id, us;
  int32_t count;
  uint8_t kind_output; /* kind in the low half */
  uint8_t reason;      /* and FRESH, AGAIN */
} outcome_t;
enum { FRESH = 0x40, AGAIN = 0x80, REASON_BITS = 0x1f };
static outcome_t ring[N_OUTCOMES];
static uint8_t ring_next, ring_kept;
/* Only `done` has a time on. Each follows its `fired`, so that no more of the ring can be such. */
#define N_DONES ((N_OUTCOMES + N_OUTPUTS) / 2 + 1)
static uint32_t done_on_us[N_DONES];
static uint8_t dones_next;
static volatile uint8_t ring_to_tell;

edge_t edges[N_EDGES];
volatile uint8_t edges_in, edges_out;

typedef struct { uint32_t us, detail; uint8_t fault; } fault_t;
static fault_t faults[N_FAULTS];
static uint8_t faults_in, faults_out;

/* An `identify` to be answered once everything before it is out; the tag of frames changes then. */
enum { NO_ANSWER, ANSWER, REFUSE, REFUSE_FAULT };
static uint8_t answer, refused_protocol;
static uint32_t answer_nonce;
static uint16_t answer_tag;
static uint16_t voice_tag;

static uint16_t told_inputs, told_outputs, told_illegal, levels_told;
static int32_t told_count;
static uint8_t told_bad, told_overruns;
static uint8_t since_sample = SAMPLE_MOST_TICKS;
static bool sample_may, clock_due;
static uint16_t to_clock = CLOCK_TICKS;

volatile uint8_t bad_frames, overruns;

/* ---- What is to be said: called with the outputs held (edges: by anyone) */

void voice_outcome(uint32_t id, uint8_t kind, uint8_t reason, uint8_t output, uint32_t us,
                   int32_t count, uint32_t on_us) {
  outcome_t *one = &ring[ring_next];
  if (ring_kept == N_OUTCOMES && (one->reason & (FRESH | AGAIN))) ring_to_tell--;
  one->id = id;
  one->us = us;
  one->count = count;
  if (kind == DONE) {
    done_on_us[dones_next] = on_us;
    dones_next = (uint8_t)((dones_next + 1) % N_DONES);
  }
  one->kind_output = (uint8_t)(kind | output << 4);
  one->reason = reason | FRESH;
  ring_to_tell++;
  ring_next = (uint8_t)((ring_next + 1) % N_OUTCOMES);
  if (ring_kept < N_OUTCOMES) ring_kept++;
}

void voice_outcome_now(uint32_t id, uint8_t kind, uint8_t reason, uint8_t output) {
  hal_irq_off();
  int32_t count = hal_count();
  hal_irq_on();
  voice_outcome(id, kind, reason, output, hal_now_us(), count, 0);
}

static outcome_t *nth_oldest(uint8_t n) {
  return &ring[(uint8_t)(ring_next + N_OUTCOMES - ring_kept + n) % N_OUTCOMES];
}

static void tell_again(outcome_t *one) {
  if (!(one->reason & (FRESH | AGAIN))) ring_to_tell++;
  one->reason |= AGAIN;
}

/* Tells everything kept about one id again. False: nothing is kept. */
bool voice_repeat(uint32_t id) {
  bool found = false;
  for (uint8_t n = 0; n < ring_kept; n++) {
    outcome_t *one = nth_oldest(n);
    if (one->id != id) continue;
    found = true;
    /* One that is about to be told for the first time need not be told twice. */
    if (!(one->reason & FRESH)) tell_again(one);
  }
  return found;
}

void voice_fault(uint8_t fault, uint32_t detail) {
  uint8_t next = (uint8_t)((faults_in + 1) % N_FAULTS);
  if (next == faults_out) return;
  faults[faults_in].fault = fault;
  faults[faults_in].us = hal_now_us();
  faults[faults_in].detail = detail;
  faults_in = next;
}

void voice_identity(uint32_t nonce) {
  answer = ANSWER;
  answer_nonce = nonce;
}

void voice_refuse_identify(uint32_t nonce, uint16_t asker, uint8_t protocol) {
  answer = REFUSE;
  answer_nonce = nonce;
  answer_tag = asker;
  refused_protocol = protocol;
}

/* A thousand times a second. */
void voice_tick(void) {
  sample_may = true;
  if (since_sample < SAMPLE_MOST_TICKS) since_sample++;
  if (--to_clock == 0) {
    to_clock = CLOCK_TICKS;
    clock_due = true;
    bank_forget_old_falls();
  }
}

/* ---- Saying it */

#define IDENTITY_BYTES 46
static bool say_identity(uint16_t frame_tag, uint8_t kept) {
  if ((uint8_t)(tx_head - tx_tail) != 0 && TX_BYTES < 2 * (IDENTITY_BYTES + 8)) return false;
  frame_restart();
  if (!frame_open(M_IDENTITY, frame_tag, IDENTITY_BYTES)) return false;
  uint16_t wraps;
  uint32_t us = hal_now_wraps(&wraps);
  frame_32(answer_nonce);
  frame_8(PROTOCOL_VERSION);
  frame_16(FIRMWARE_VERSION);
  frame_32(boot_id);
  frame_32(board_id);
  frame_16(previous_tag);
  frame_16(CAPABILITY_SLOTS | CAPABILITY_SYNC);
  frame_8(N_OUTPUTS);
  frame_8(N_INPUTS);
  frame_8(N_SLOTS);
  frame_8(kept);
  frame_32(us);
  frame_16(wraps);
  frame_8(reset_cause);
  for (uint8_t i = 0; i < 16; i++) frame_8((uint8_t)hal_model(i));
  frame_close();
  return true;
}

static bool say_answer(void) {
  if (answer == REFUSE_FAULT) {
    if (!frame_open(M_FAULT, answer_tag, 9)) return false;
    frame_8(F_BAD_PROTOCOL);
    frame_32(hal_now_us());
    frame_32(refused_protocol);
    frame_close();
    answer = NO_ANSWER;
    return true;
  }
  if (answer == REFUSE) {
    if (!say_identity(answer_tag, 0)) return false;
    answer = REFUSE_FAULT;
    return true;
  }
  bank_hold();
  uint8_t kept = ring_kept;
  bool said = say_identity(tag, kept);
  if (said) {
    for (uint8_t n = 0; n < kept; n++) tell_again(nth_oldest(n));
    answer = NO_ANSWER;
    voice_tag = tag;
  }
  bank_release_unchanged();
  return said;
}

/* The time on that was kept with a `done`: as many back as there are newer ones. */
static uint32_t on_us_of(const outcome_t *one) {
  if ((one->kind_output & 0x0f) != DONE) return 0;
  uint8_t back = 0;
  for (uint8_t n = ring_kept; n-- > 0;) {
    const outcome_t *other = nth_oldest(n);
    if ((other->kind_output & 0x0f) == DONE) back++;
    if (other == one) break;
  }
  return done_on_us[(uint8_t)(dones_next + N_DONES - back) % N_DONES];
}

static void say_outcome(const outcome_t *one, uint32_t on_us) {
  frame_32(one->id);
  frame_8(one->kind_output & 0x0f);
  frame_8(one->reason & REASON_BITS);
  frame_8(one->kind_output >> 4);
  frame_8(one->reason & AGAIN ? 1 : 0);
  frame_32(one->us);
  frame_32((uint32_t)one->count);
  frame_32(on_us);
  frame_close();
}

static bool say_edge(void) {
  if (!frame_open(M_EDGE, voice_tag, 10)) return false;
  const edge_t *edge = &edges[edges_out];
  frame_32(edge->us);
  frame_32((uint32_t)edge->count);
  uint8_t level = edge->what & 1, input = (edge->what >> 1) & 0x0f;
  frame_8((edge->what & SYNC_EDGE) | input);
  frame_8(level);
  frame_close();
  if (!(edge->what & SYNC_EDGE)) {
    uint16_t bit = (uint16_t)(1u << input);
    if (level) levels_told |= bit;
    else levels_told &= (uint16_t)~bit;
  }
  edges_out = (uint8_t)((edges_out + 1) % N_EDGES);
  return true;
}

static bool say_fault(void) {
  if (!frame_open(M_FAULT, voice_tag, 9)) return false;
  const fault_t *fault = &faults[faults_out];
  frame_8(fault->fault);
  frame_32(fault->us);
  frame_32(fault->detail);
  frame_close();
  /* The last word under the tag that ended. */
  if (fault->fault == F_WATCHDOG_OUTPUTS) voice_tag = 0;
  faults_out = (uint8_t)((faults_out + 1) % N_FAULTS);
  return true;
}

static bool say_clock(void) {
  if (!frame_open(M_CLOCK, voice_tag, 6)) return false;
  uint16_t wraps;
  frame_32(hal_now_wraps(&wraps));
  frame_16(wraps);
  frame_close();
  clock_due = false;
  return true;
}

static bool say_sample(void) {
  hal_irq_off();
  int32_t count = hal_count();
  uint16_t illegal = hal_illegal();
  uint16_t on = hal_outputs_on();
  hal_irq_on();
  uint32_t us = hal_now_us();
  sample_may = false;
  bool same = count == told_count && on == told_outputs && levels_told == told_inputs &&
              illegal == told_illegal && bad_frames == told_bad && overruns == told_overruns;
  if (same && since_sample < SAMPLE_MOST_TICKS) return false;
  if (!frame_open(M_SAMPLE, voice_tag, 16)) {
    sample_may = true;
    return false;
  }
  since_sample = 0;
  frame_32(us);
  frame_32((uint32_t)(told_count = count));
  frame_16(told_inputs = levels_told);
  frame_16(told_outputs = on);
  frame_16(told_illegal = illegal);
  frame_8(told_bad = bad_frames);
  frame_8(told_overruns = overruns);
  frame_close();
  return true;
}

/* The oldest outcome that is to be told: for the first time, or again. */
static outcome_t *next_outcome(void) {
  for (uint8_t n = 0; n < ring_kept; n++) {
    outcome_t *one = nth_oldest(n);
    if (one->reason & (FRESH | AGAIN)) return one;
  }
  return 0;
}

/* Says one thing. False: there is nothing to say, or no room in the line's ring. */
bool voice_speak(void) {
  bool edge = edges_in != edges_out && answer == NO_ANSWER;
  bool fault = faults_in != faults_out;
  if (ring_to_tell) {
    bank_hold();
    outcome_t *one = next_outcome();
    bool later = !one || (!(one->reason & AGAIN) &&
                          ((edge && (int32_t)(edges[edges_out].us - one->us) < 0) ||
                           (fault && (int32_t)(faults[faults_out].us - one->us) < 0)));
    outcome_t copy;
    uint32_t on_us = 0;
    bool room = !later && frame_open(M_OUTCOME, voice_tag, 20);
    if (room) {
      copy = *one;
      on_us = on_us_of(one);
      one->reason &= REASON_BITS;
      ring_to_tell--;
    }
    bank_release_unchanged();
    if (room) say_outcome(&copy, on_us);
    if (!later) return room;
  }
  if (edge && !(fault && (int32_t)(faults[faults_out].us - edges[edges_out].us) < 0)) {
    return say_edge();
  }
  if (fault) return say_fault();
  if (answer != NO_ANSWER) return say_answer();
  if (clock_due) return say_clock();
  return sample_may && say_sample();
}

/* Every edge is told, and the sample that was due after them. */
bool voice_caught_up(void) { return edges_in == edges_out && !sample_may; }

/* After a reset the board speaks first; the levels it finds are no edges. */
void voice_boot(void) {
  levels_told = hal_input_levels;
  voice_identity(0);
  if (reset_cause == RESET_BROWN_OUT) voice_fault(F_BROWN_OUT, 0);
}
