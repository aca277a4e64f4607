#include "board.h"

static waiting_t places[N_WAITING]; /* `id` 0: this place is free */
static uint16_t next_order;
static uint8_t waiting; /* how many places are taken: most often none, and that is quickly seen */

/* False when every place is taken. */
bool waiting_add(const pulse_t *pulse, uint32_t start_us) {
  for (waiting_t *place = places; place < places + N_WAITING; place++) {
    if (place->id != 0) continue;
    place->id = pulse->id;
    place->output = pulse->output;
    place->window.flags = pulse->flags;
    place->shape = pulse->shape;
    place->window.start_us = start_us;
    place->window.count_from = pulse->count_from;
    place->window.count_to = pulse->count_to;
    place->order = next_order++;
    waiting++;
    return true;
  }
  return false;
}

/* Lets the earliest pulse that is due rise, or be refused. False: none is due. */
bool waiting_rise_due(uint32_t now_us) {
  waiting_t *due = 0;
  if (!waiting) return false;
  for (waiting_t *place = places; place < places + N_WAITING; place++) {
    if (place->id == 0 || (int32_t)(place->window.start_us - now_us) > 0) continue;
    if (due) {
      int32_t later = (int32_t)(place->window.start_us - due->window.start_us);
      if (later > 0 || (later == 0 && (int16_t)(place->order - due->order) > 0)) continue;
    }
    due = place;
  }
  if (!due) return false;
  uint32_t id = due->id;
  due->id = 0;
  waiting--;
  bank_rise(id, due->output, &due->shape, &due->window);
  return true;
}

/* Microseconds to the next start; all ones when none waits. */
uint32_t waiting_next_us(uint32_t now_us) {
  uint32_t next = UINT32_MAX;
  if (!waiting) return next;
  for (waiting_t *place = places; place < places + N_WAITING; place++) {
    if (place->id == 0) continue;
    int32_t left = (int32_t)(place->window.start_us - now_us);
    if (left < 0) left = 0;
    if ((uint32_t)left < next) next = (uint32_t)left;
  }
  return next;
}

void waiting_end(uint16_t mask, uint8_t reason) {
  for (waiting_t *place = places; place < places + N_WAITING; place++) {
    if (place->id == 0 || !(mask & 1u << place->output)) continue;
    voice_outcome_now(place->id, DISARMED, reason, place->output);
    place->id = 0;
    waiting--;
  }
}

bool waiting_has(uint32_t id) {
  for (waiting_t *place = places; place < places + N_WAITING; place++) {
    if (place->id == id) return true;
  }
  return false;
}
