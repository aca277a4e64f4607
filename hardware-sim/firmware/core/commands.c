/* What the host says, checked: tags, silence, ids, expiry; then handed to the outputs. */
#include "board.h"

uint16_t tag, previous_tag;

/* ---- Silence: WIRE.md, rules 7 to 11 */
static uint32_t heard_us, newest_finished_us;
static bool beaten, finished_any, slots_ended;
volatile uint8_t host_fresh;

static void silence_begin(void) {
  beaten = finished_any = slots_ended = false;
  heard_us = hal_now_us();
}

static void beat(const beat_t *message) {
  int32_t age_us = (int32_t)(hal_now_us() - message->finished_us);
  uint32_t finished_us = message->finished_us;
  if (age_us < 0) return;
  if (finished_any && (int32_t)(finished_us - newest_finished_us) < 0) return;
  finished_any = true;
  newest_finished_us = finished_us;
  if ((int32_t)(finished_us - heard_us) > 0) heard_us = finished_us;
  if (age_us < (int32_t)SLOT_SILENCE_US) {
    beaten = true;
    slots_ended = false;
    host_fresh = 1;
  }
  slots_end(message->wanted, 0xffff, R_UNWANTED);
}

static void silence_watch(void) {
  uint32_t silent_us = hal_now_us() - heard_us;
  if (silent_us < SLOT_SILENCE_US) return;
  host_fresh = 0;
  if (!slots_ended) {
    slots_ended = true;
    bank_hold();
    slots_end(0, 0xffff, R_SILENCE);
    voice_fault(F_WATCHDOG_SLOTS, silent_us);
    bank_release();
  }
  if (silent_us < OUTPUT_SILENCE_US) return;
  bank_hold();
  bank_end_for_silence(R_SILENCE);
  voice_fault(F_WATCHDOG_OUTPUTS, silent_us);
  previous_tag = tag;
  tag = 0;
  bank_release();
}

/* ---- Ids: the highest under this tag, and which of the 64 below it were seen */
static uint32_t highest_id;
static uint8_t seen_below[8]; /* bit n: id highest - 1 - n */
enum { ID_NEW, ID_SEEN, ID_OLD };

static void forget_ids(void) {
  highest_id = 0;
  for (uint8_t i = 0; i < 8; i++) seen_below[i] = 0;
}

/* The bitmap moves up by one: `bit` becomes bit 0. */
static void shift_seen(uint8_t bit) {
  for (uint8_t i = 0; i < 8; i++) {
    uint8_t out = seen_below[i] >> 7;
    seen_below[i] = (uint8_t)(seen_below[i] << 1 | bit);
    bit = out;
  }
}

static uint8_t take_id(uint32_t id) {
  if (id > highest_id) {
    uint32_t by = id - highest_id;
    if (by > 64) by = 65;
    for (uint8_t bit = highest_id != 0; by > 0; by--, bit = 0) shift_seen(bit);
    highest_id = id;
    return ID_NEW;
  }
  if (id == highest_id) return ID_SEEN;
  uint32_t below = highest_id - 1 - id;
  if (below >= 64) return ID_OLD;
  uint8_t *byte = &seen_below[below >> 3], mask = (uint8_t)(1u << (below & 7));
  if (*byte & mask) return ID_SEEN;
  *byte |= mask;
  return ID_NEW;
}

static void refuse(uint32_t id, uint8_t output, uint8_t reason) {
  voice_outcome_now(id, REFUSED, reason, output);
}

/* True for an id that is new under this tag; otherwise answers what may be answered. */
static bool id_is_new(uint32_t id, uint8_t output) {
  if (id == 0) {
    refuse(0, output, R_BAD_SHAPE);
    return false;
  }
  uint8_t seen = take_id(id);
  if (seen == ID_NEW) return true;
  if (!voice_repeat(id) && seen == ID_OLD && !waiting_has(id) && !slots_have(id)) {
    refuse(id, output, R_OLD_ID);
  }
  return false;
}

/* ---- Commands */

static void obey_identify(const identify_t *message) {
  if (message->protocol != PROTOCOL_VERSION || message->new_tag == 0) {
    voice_refuse_identify(message->nonce, message->new_tag, message->protocol);
    return;
  }
  if (message->new_tag != tag) {
    if (tag != 0) {
      bank_end_for_silence(R_NEW_TAG);
      previous_tag = tag;
    }
    bank_unconfigure();
    forget_ids();
    tag = message->new_tag;
    silence_begin();
  }
  voice_identity(message->nonce);
}

static uint8_t arriving_reason(uint8_t output, const shape_t *shape) {
  if (output >= N_OUTPUTS) return R_BAD_SHAPE;
  if (!beaten) return R_SILENCE;
  return output_shape_reason(&outputs[output], shape);
}

static void obey_pulse(const pulse_t *message) {
  uint32_t id = message->id, now_us = hal_now_us();
  uint8_t output = message->output;
  if (!id_is_new(id, output)) return;
  int32_t ahead_us = (int32_t)(message->expiry_us - now_us);
  int32_t delay_us = message->flags & START_AT ? (int32_t)(message->start_us - now_us) : 0;
  uint8_t reason = arriving_reason(output, &message->shape);
  if (reason == R_NONE && ahead_us < 0) {
    voice_outcome_now(id, EXPIRED, R_NONE, output);
    return;
  }
  if (reason == R_NONE && (ahead_us >= EXPIRY_MOST_US || delay_us > ahead_us)) {
    reason = R_BAD_EXPIRY;
  }
  if (reason != R_NONE) {
    refuse(id, output, reason);
  } else if (delay_us <= 0) {
    window_t window = {message->flags & COUNT_WINDOW, 0, message->count_from, message->count_to};
    bank_rise(id, output, &message->shape, &window);
  } else if (!waiting_add(message, message->start_us)) {
    refuse(id, output, R_BUSY);
    voice_fault(F_QUEUE_FULL, id);
  }
}

static void obey_arm(const arm_t *message) {
  uint32_t id = message->id;
  uint8_t output = message->output;
  if (!id_is_new(id, output)) return;
  uint8_t n = message->slot;
  uint8_t reason = n < N_SLOTS ? arriving_reason(output, &message->shape) : R_BAD_SLOT;
  if (reason == R_NONE) {
    slots_take_hits();
    if (hal_now_us() - heard_us >= SLOT_SILENCE_US) reason = R_SILENCE;
    else if (orders[n].armed) reason = R_SLOT_TAKEN;
    else if (slots_share_low_byte(message->count)) reason = R_SHARED_LOW_BYTE;
  }
  if (reason != R_NONE) {
    refuse(id, output, reason);
    return;
  }
  order_t *order = &orders[n];
  order->id = id;
  order->output = output;
  order->rising = message->rising != 0;
  order->shape = message->shape;
  slot_t *slot = &slots[n];
  slot->target = message->count;
  slot->rose = 0;
  slot->fast = output_slot_fast(slot->target, order) ? BIT(output) : 0;
  if (!slot_arm(n)) voice_outcome_now(id, PASSED, R_NONE, output);
}

/* Frames of another tag, told at once and then at most ten times a second. */
static uint32_t wrong_tags, wrong_tag_told_us;
static bool wrong_tag_told;

static void tell_wrong_tags(void) {
  uint32_t now_us = hal_now_us();
  if (wrong_tag_told && now_us - wrong_tag_told_us < WRONG_TAG_EVERY_US) return;
  wrong_tag_told = true;
  wrong_tag_told_us = now_us;
  voice_fault(F_WRONG_TAG, wrong_tags);
  wrong_tags = 0;
}

/* How long a message's payload is; 0xff: no host sends such a type. */
uint8_t command_payload_bytes(uint8_t type) {
  switch (type) {
    case M_IDENTIFY: return sizeof(identify_t);
    case M_CONFIGURE: return sizeof(configure_t);
    case M_PULSE: return sizeof(pulse_t);
    case M_ARM: return sizeof(arm_t);
    case M_QUIET: return sizeof(quiet_t);
    case M_BEAT: return sizeof(beat_t);
    case M_SYNC: return sizeof(sync_t);
    default: return 0xff;
  }
}

void command_obey(uint8_t type, uint16_t frame_tag, const void *payload) {
  bank_hold();
  slots_take_hits();
  if (type == M_IDENTIFY) {
    obey_identify(payload);
  } else if (type == M_QUIET) {
    uint16_t mask = ((const quiet_t *)payload)->outputs;
    bank_end_all(mask, R_CUT);
  } else if (frame_tag == 0 || frame_tag != tag) {
    wrong_tags++;
    tell_wrong_tags();
  } else if (type == M_CONFIGURE) {
    output_configure(payload);
  } else if (type == M_PULSE) {
    obey_pulse(payload);
  } else if (type == M_ARM) {
    obey_arm(payload);
  } else if (type == M_BEAT) {
    beat(payload);
  } else {
    output_sync(payload);
  }
  bank_release();
}

/* A thousand times a second: silence, slots left behind, refused frames still to be told. */
void command_tick(void) {
  if (tag != 0) silence_watch();
  bank_hold();
  slots_sweep();
  bank_release_unchanged();
  if (wrong_tags > 0) tell_wrong_tags();
}
