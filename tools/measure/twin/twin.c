/*
 * The live loop in C, for comparison: the same circuit and solver (plant.h, made from the generated functions of the
 * bench), the same messages (messages.h, made by `oilspring wire`), the same sockets, waiting, hash and row of evidence.
 * It has no scenario, no sensors, no watch and no requirements.
 *
 *   twin OWN_PORT PEER_PORT TICKS CORE [SPEED_ROUNDS [LONGEST]]
 *
 * With SPEED_ROUNDS (and the longest stride in substeps) it runs that many steps without waiting and prints their cost instead (up to 1000: the states at
 * their end). Prints one line of JSON, times in ns.
 */
#define _GNU_SOURCE
#include <arpa/inet.h>
#include <errno.h>
#include <math.h>
#include <sched.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/prctl.h>
#include <sys/socket.h>
#include <time.h>
#include "messages.h"

static inline double maximum(double a, double b) { return a > b ? a : b; }
static inline double minimum(double a, double b) { return a < b ? a : b; }
static inline double signum(double a) { return a > 0 ? 1 : a < 0 ? -1 : a; }
#include "plant.h"

static double y[STATES], m[MEMORY + 1], u[COMMANDS + 1], next[MEMORY + 1], observed[OBSERVED];
static double ledger[RATES - STATES], open_power[RATES - STATES];
static double d[RATES], J[ELIMINATION + 1], k1[STATES], k2[STATES], k3[STATES], k4[STATES], b[STATES + RATES], stage[STATES], estimate[2];
static double block[STATES + MEMORY + COMMANDS + BLOCK_MORE];
static float ring[64][ROW];
static unsigned long refused;

/* Strides as in the solver: 1 passes each substep by itself. */
static int longest = SUBSTEPS;

static void remember(double h)
{
    update(stage, u, m, h, next);
    memcpy(m, next, sizeof m);
}

/* One attempt of length h; whether it is accurate enough for a stride. The safety net is not part of the twin: its case
   is counted. */
static int attempt(double h)
{
    ratesAndJacobian(y, u, m, d, J);
    factor(J, 2 / h);
    stageOne(J, d, y, h, k1, k2, stage);
    rates(stage, u, m, b);
    stageTwo(J, b, h, k1, k2, k3, stage);
    rates(stage, u, m, b);
    stageThree(J, b, h, k1, k2, k3, k4, stage, estimate);
    strideError(k4, estimate);
    return J[ELIMINATION] >= 0.1 && estimate[0] <= 1 && estimate[1] <= 1;
}

static void step(void)
{
    const double h = STEP / SUBSTEPS;
    double length = 0;
    memcpy(stage, y, sizeof y);
    remember(0);
    int size = longest;
    for (int left = SUBSTEPS; left > 0;) {
        if (size > left) size = left;
        int good = attempt(size * h);
        if (size > 1) {
            if (good) {
                update(stage, u, m, size * h, next);
                for (int i = 0; i < LATCHES; i += 1) good &= next[latches[i]] == m[latches[i]];
            }
            if (!good) {
                size >>= 1;
                continue;
            }
            memcpy(m, next, sizeof m);
        } else {
            if (!(J[ELIMINATION] >= 0.1 && estimate[0] <= 1)) refused += 1;
            remember(h);
        }
        for (int i = 0; i < RATES - STATES; i += 1) {
            ledger[i] += 0.5 * (length * (open_power[i] + d[STATES + i]));
            open_power[i] = d[STATES + i];
        }
        length = size * h;
        memcpy(y, stage, sizeof y);
        left -= size;
    }
    observe(y, u, m, observed);
    for (int i = 0; i < RATES - STATES; i += 1) ledger[i] += 0.5 * (length * (open_power[i] + observed[LEDGER_AT + i]));
}

static uint32_t turn(uint32_t x, int by) { return (x << by) | (x >> (32 - by)); }
static uint32_t avalanche(uint32_t h)
{
    h = (h ^ (h >> 16)) * 0x85ebca6bu;
    h = (h ^ (h >> 13)) * 0xc2b2ae35u;
    return h ^ (h >> 16);
}
static void hash(const uint32_t *words, size_t count, uint32_t out[2])
{
    uint32_t a = 0x243f6a88u, b2 = 0x85a308d3u, c = 0x13198a2eu, e = 0x03707344u;
    size_t i = 0;
    for (; i + 4 <= count; i += 4) {
        a = turn((a ^ words[i]) * 0x9e3779b1u, 13);
        b2 = turn((b2 ^ words[i + 1]) * 0x85ebca77u, 15);
        c = turn((c ^ words[i + 2]) * 0xc2b2ae3du, 17);
        e = turn((e ^ words[i + 3]) * 0x27d4eb2fu, 11);
    }
    for (; i < count; i += 1) a = turn((a ^ words[i]) * 0x9e3779b1u, 13);
    a = avalanche(a ^ (uint32_t)count);
    b2 = avalanche(b2 + a);
    c = avalanche(c + b2);
    e = avalanche(e + c);
    out[0] = a ^ c;
    out[1] = b2 + e * 0x9e3779b1u;
}

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec * 1e9 + (double)t.tv_nsec;
}
static double used(void)
{
    struct timespec t;
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
    return (double)t.tv_sec * 1e9 + (double)t.tv_nsec;
}

static int ascending(const void *a, const void *c)
{
    double x = *(const double *)a, z = *(const double *)c;
    return (x > z) - (x < z);
}
static void print(const char *name, double *values, size_t count)
{
    if (count == 0) count = 1;
    qsort(values, count, sizeof *values, ascending);
    printf("\"%s\":{\"p50\":%.0f,\"p99\":%.0f,\"p999\":%.0f,\"max\":%.0f},", name, values[count / 2], values[(size_t)(0.99 * (double)(count - 1))],
           values[(size_t)(0.999 * (double)(count - 1))], values[count - 1]);
}

#define MOST 4000000
static double lateness[MOST], whole[MOST], plant_time[MOST], take_time[MOST], publish_time[MOST], record_time[MOST];

int main(int argc, char **argv)
{
    if (argc < 5) return 2;
    long ticks = atol(argv[3]);
    if (ticks > MOST) ticks = MOST;
    memcpy(y, y_start, sizeof y);
    memcpy(m, m_start, sizeof m_start);
    memcpy(u, u_start, sizeof u_start);
    observe(y, u, m, observed);
    if (argc > 6) longest = atoi(argv[6]);
    if (argc > 5) {
        long rounds = atol(argv[5]);
        static double costs[MOST];
        if (rounds <= 1000) {
            /* for a test: the states after so many steps, whole */
            for (long i = 0; i < rounds; i += 1) step();
            printf("[");
            for (int i = 0; i < STATES; i += 1) printf("%s%.17g", i > 0 ? "," : "", y[i]);
            printf("]\n");
            return 0;
        }
        long parts = rounds / 100;
        for (long i = 0; i < parts && i < MOST; i += 1) {
            double from = used();
            for (int k = 0; k < 100; k += 1) step();
            costs[i] = (used() - from) / 100;
        }
        printf("{");
        print("step", costs, (size_t)parts);
        double from = used();
        for (long i = 0; i < rounds; i += 1) { y[0] += 1e-300; rates(y, u, m, d); }
        printf("\"evaluation\":%.0f,\"refused\":%lu}\n", (used() - from) / (double)rounds, refused);
        return 0;
    }
    int link = socket(AF_INET, SOCK_DGRAM | SOCK_NONBLOCK, 0);
    struct sockaddr_in own = {.sin_family = AF_INET, .sin_port = htons((uint16_t)atoi(argv[1]))};
    struct sockaddr_in peer = {.sin_family = AF_INET, .sin_port = htons((uint16_t)atoi(argv[2]))};
    inet_pton(AF_INET, "127.0.0.1", &own.sin_addr);
    inet_pton(AF_INET, "127.0.0.1", &peer.sin_addr);
    if (bind(link, (struct sockaddr *)&own, sizeof own) != 0) {
        perror("bind");
        return 2;
    }
    if (atoi(argv[4]) >= 0) {
        cpu_set_t set;
        CPU_ZERO(&set);
        CPU_SET(atoi(argv[4]), &set);
        sched_setaffinity(0, sizeof set, &set);
    }
    prctl(PR_SET_TIMERSLACK, 1, 0, 0, 0);
    struct sched_param parameter = {.sched_priority = 80};
    int fifo = sched_setscheduler(0, SCHED_FIFO, &parameter) == 0;

    unsigned char datagram[OILSPRING_GREATEST_LENGTH + 1];
    uint32_t sequences[256] = {0}, digest[2];
    long replies = 0, next_step = 0, overruns = 0;
    const double period = STEP * 1e9;
    const long warm = 2000;
    double deadline = now() + period, busy = 0, began = 0;
    for (long t = -warm; t < ticks; t += 1) {
        double sleep_to = deadline - 90000;
        if (now() < sleep_to) {
            struct timespec until = {(time_t)(sleep_to / 1e9), 0};
            until.tv_nsec = (long)(sleep_to - (double)until.tv_sec * 1e9);
            while (clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &until, NULL) == EINTR) {}
        }
        double start = now();
        while (start < deadline) start = now();
        if (t == 0) { busy = used(); began = start; replies = 0; next_step = 0; overruns = 0; }
        double late = start - deadline;
        if (late >= period) { deadline += late; overruns += 1; }
        deadline += period;
        /* take */
        for (;;) {
            struct sockaddr_in from;
            socklen_t size = sizeof from;
            ssize_t length = recvfrom(link, datagram, sizeof datagram, MSG_TRUNC, (struct sockaddr *)&from, &size);
            if (length < 0) break;
            if (oilspring_check(datagram, (size_t)length) != OILSPRING_SOUND) continue;
            struct oilspring_header header;
            memcpy(&header, datagram, sizeof header);
            if (header.kind != OILSPRING_KIND_MESSAGE) continue;
            use(header.message, datagram, u);
            replies += 1;
            if ((int32_t)(header.tick - (uint32_t)t + 1) == 0) next_step += 1;
        }
        double taken = now();
        step();
        double stepped = now();
        /* publish */
        publish(t, observed, sequences, link, &peer);
        double published = now();
        /* record */
        memcpy(block, y, sizeof y);
        hash((const uint32_t *)block, 2 * (sizeof block / sizeof *block), digest);
        for (int i = 0; i < ROW; i += 1) ring[t & 63][i] = (float)observed[i % OBSERVED];
        ring[t & 63][0] += (float)(digest[0] & 1);
        double end = now();
        if (end > deadline) { deadline = end + 1; overruns += 1; }
        if (t < 0) continue;
        lateness[t] = late;
        take_time[t] = taken - start;
        plant_time[t] = stepped - taken;
        publish_time[t] = published - stepped;
        record_time[t] = end - published;
        whole[t] = end - start;
    }
    double share = (used() - busy) / (now() - began);
    size_t count = (size_t)ticks;
    printf("{\"fifo\":%d,\"share\":%.4f,\"overruns\":%ld,\"replies\":%ld,\"oneStepShare\":%.5f,\"refused\":%lu,", fifo, share, overruns, replies,
           replies > 0 ? (double)next_step / (double)replies : 0.0, refused);
    print("lateness", lateness, count);
    print("take", take_time, count);
    print("plant", plant_time, count);
    print("publish", publish_time, count);
    print("record", record_time, count);
    print("tick", whole, count);
    printf("\"ticks\":%zu}\n", count);
    return 0;
}
