/*
 * Holds products, quotients, sums and differences in whole numbers against the processor's own, bit by bit; any NaN is like another.
 * Compiled behind the functions themselves.
 */
#include <stddef.h>

uint64_t scan_arithmetic(uint64_t from, uint64_t until, uint32_t *worst);

static uint64_t state;

/* Sebastiano Vigna's splitmix64. */
static uint32_t drawn(void)
{
    uint64_t z = (state += 0x9E3779B97F4A7C15u);

    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9u;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBu;
    return (uint32_t)(z >> 32);
}

static float number(uint32_t word)
{
    arm_bits bits;

    bits.word = word;
    return bits.real;
}

static int alike(float a, float b)
{
    arm_bits x;
    arm_bits y;

    x.real = a;
    y.real = b;
    return (x.word == y.word) || ((a != a) && (b != b));
}

/* A fraction of 23 digits: few digits, many, or any. */
static uint32_t fraction(void)
{
    static const uint32_t some[] = {0u, 1u, 2u, 3u, 0x400000u, 0x400001u, 0x3FFFFFu, 0x7FFFFFu, 0x7FFFFEu, 0x555555u};
    const uint32_t which = drawn() & 15u;

    if (which < 10u) {
        return some[which];
    }
    return (which < 12u) ? ((1u << (drawn() % 23u)) - (drawn() & 1u)) & 0x7FFFFFu : drawn() & 0x7FFFFFu;
}

/* How many results differ, for pairs of exponents from..until (each of both below 2^16); the last pair that did. */
uint64_t scan_arithmetic(uint64_t from, uint64_t until, uint32_t *worst)
{
    uint64_t wrong = 0u;

    state = from;
    for (uint64_t pair = from; pair < until; ++pair) {
        for (int draw = 0; draw < 96; ++draw) {
            const uint32_t signs = drawn();
            const uint32_t a_word = ((uint32_t)(pair & 255u) << 23) | fraction() | (signs & 0x80000000u);
            const uint32_t b_word = ((uint32_t)(pair >> 8) << 23) | fraction() | ((signs << 1) & 0x80000000u);
            const volatile float a = number(a_word);
            const volatile float b = number(b_word);

            if (!alike(arm_product(a, b), a * b) || !alike(arm_sum(a, b), a + b) || !alike(arm_difference(a, b), a - b)
                || !alike(arm_quotient(a, b), a / b)) {
                ++wrong;
                worst[0] = a_word;
                worst[1] = b_word;
            }
        }
    }
    return wrong;
}
