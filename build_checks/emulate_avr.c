/*
 * One AVR processor in the simavr library, driven function by function: exact cycles, no start-up code.
 */
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <simavr/sim_avr.h>
#include <simavr/sim_core.h>

enum { STACK_LOW = 0x5d, STACK_HIGH = 0x5e, PC_BYTES = 3 };

/* A processor with an empty flash, or NULL. */
avr_t *avr_open(const char *name)
{
    avr_t *const avr = avr_make_mcu_by_name(name);

    if (avr != NULL) {
        avr_init(avr);
        avr->log = 0;
        memset(avr->flash, 0xff, (size_t)avr->flashend + 1u);
    }
    return avr;
}

void avr_close(avr_t *avr)
{
    avr_terminate(avr);
    free(avr);
}

uint32_t avr_flash_bytes(const avr_t *avr)
{
    return (uint32_t)avr->flashend + 1u;
}

uint32_t avr_memory_bytes(const avr_t *avr)
{
    return (uint32_t)avr->ramend + 1u;
}

void avr_flash(avr_t *avr, uint32_t address, const uint8_t *bytes, uint32_t count)
{
    memcpy(avr->flash + address, bytes, count);
}

/* Registers (0 to 31) and memory are one address space. */
void avr_poke(avr_t *avr, uint32_t address, const uint8_t *bytes, uint32_t count)
{
    memcpy(avr->data + address, bytes, count);
}

void avr_peek(const avr_t *avr, uint32_t address, uint8_t *bytes, uint32_t count)
{
    memcpy(bytes, avr->data + address, count);
}

/*
 * Calls the function at byte address `entry` with the stack empty below `stack`; arguments are in the registers already.
 *
 * Returns 0 when it returned, 1 when it ran past `limit` instructions, 2 when the processor crashed or stopped.
 */
int avr_call(avr_t *avr, uint32_t entry, uint32_t stack, uint64_t limit, uint64_t *instructions, uint64_t *cycles)
{
    const avr_flashaddr_t home = (avr_flashaddr_t)avr->flashend - 1u;
    const avr_flashaddr_t home_word = home >> 1;
    const uint32_t top = stack - PC_BYTES;
    const avr_cycle_count_t start = avr->cycle;
    uint64_t executed = 0;

    avr->data[stack] = (uint8_t)home_word;
    avr->data[stack - 1u] = (uint8_t)(home_word >> 8);
    avr->data[stack - 2u] = (uint8_t)(home_word >> 16);
    avr->data[STACK_LOW] = (uint8_t)top;
    avr->data[STACK_HIGH] = (uint8_t)(top >> 8);
    avr->data[1] = 0; /* the compiler's zero register */
    avr->pc = entry;
    avr->state = cpu_Running;
    while ((avr->pc != home) && (avr->state == cpu_Running) && (executed < limit)) {
        avr->pc = avr_run_one(avr);
        executed++;
    }
    *instructions = executed;
    *cycles = avr->cycle - start;
    if (avr->state != cpu_Running) {
        return 2;
    }
    return (avr->pc == home) ? 0 : 1;
}
