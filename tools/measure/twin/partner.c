/*
 * The other end of a bench's UDP link for measurements: answers each trigger message at once with ready-made datagrams
 * (sequence, tick and checksum filled in) and notes when the bench's datagrams came.
 *
 *   partner OWN_PORT BENCH_PORT TEMPLATES [CORE]
 *
 * TEMPLATES: for each answer two 16-bit numbers (trigger message, length) and the datagram. Ends on SIGTERM and prints
 * one line of JSON: intervals between arrivals of trigger datagrams of different ticks, turn-around, all ns.
 */
#define _GNU_SOURCE
#include <arpa/inet.h>
#include <sched.h>
#include <signal.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <time.h>
#include <unistd.h>

static volatile sig_atomic_t stopping;
static void stop(int number) { (void)number; stopping = 1; }

static uint32_t table[256];
static void make_table(void)
{
    for (uint32_t i = 0; i < 256; i += 1) {
        uint32_t c = i;
        for (int k = 0; k < 8; k += 1) c = c & 1 ? (c >> 1) ^ 0xEDB88320u : c >> 1;
        table[i] = c;
    }
}
static uint32_t crc32(const unsigned char *bytes, size_t length)
{
    uint32_t crc = 0xFFFFFFFFu;
    for (size_t i = 0; i < length; i += 1) crc = (crc >> 8) ^ table[(crc ^ bytes[i]) & 255];
    return crc ^ 0xFFFFFFFFu;
}

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return t.tv_sec * 1e9 + t.tv_nsec;
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

#define MOST 4000000
static double intervals[MOST];
static double turns[MOST];

static void print(const char *name, double *values, size_t count)
{
    qsort(values, count, sizeof *values, ascending);
    printf("\"%s\":{\"count\":%zu", name, count);
    if (count > 0)
        printf(",\"p1\":%.0f,\"p50\":%.0f,\"p99\":%.0f,\"p999\":%.0f,\"max\":%.0f", values[count / 100], values[count / 2],
               values[(size_t)(0.99 * (count - 1))], values[(size_t)(0.999 * (count - 1))], values[count - 1]);
    printf("}");
}

int main(int argc, char **argv)
{
    if (argc < 4) return 2;
    make_table();
    static unsigned char store[65536];
    unsigned char *answers[64];
    uint16_t triggers[64], lengths[64];
    uint32_t sequences[64] = {0};
    size_t count = 0;
    FILE *file = fopen(argv[3], "rb");
    if (file == NULL) return 2;
    size_t size = fread(store, 1, sizeof store, file);
    fclose(file);
    for (size_t at = 0; at + 4 <= size && count < 64; count += 1) {
        memcpy(&triggers[count], store + at, 2);
        memcpy(&lengths[count], store + at + 2, 2);
        answers[count] = store + at + 4;
        at += 4u + lengths[count];
    }
    if (argc > 4) {
        cpu_set_t set;
        CPU_ZERO(&set);
        CPU_SET(atoi(argv[4]), &set);
        sched_setaffinity(0, sizeof set, &set);
    }
    struct sched_param parameter = {.sched_priority = 70};
    sched_setscheduler(0, SCHED_FIFO, &parameter);
    struct sigaction action = {.sa_handler = stop};
    sigaction(SIGTERM, &action, NULL);
    sigaction(SIGINT, &action, NULL);
    int link = socket(AF_INET, SOCK_DGRAM, 0);
    struct sockaddr_in own = {.sin_family = AF_INET, .sin_port = htons((uint16_t)atoi(argv[1]))};
    struct sockaddr_in bench = {.sin_family = AF_INET, .sin_port = htons((uint16_t)atoi(argv[2]))};
    inet_pton(AF_INET, "127.0.0.1", &own.sin_addr);
    inet_pton(AF_INET, "127.0.0.1", &bench.sin_addr);
    if (bind(link, (struct sockaddr *)&own, sizeof own) != 0) {
        perror("bind");
        return 2;
    }
    unsigned char datagram[4096];
    size_t seen = 0, turned = 0;
    double last = 0;
    uint32_t last_tick = 0;
    while (!stopping) {
        ssize_t length = recv(link, datagram, sizeof datagram, 0);
        if (length < 24 || datagram[5] != 1) continue;
        double came = now();
        uint16_t message;
        uint32_t tick;
        memcpy(&message, datagram + 6, 2);
        memcpy(&tick, datagram + 12, 4);
        int answered = 0;
        for (size_t i = 0; i < count; i += 1) {
            if (triggers[i] != message) continue;
            memcpy(answers[i] + 8, &sequences[i], 4);
            sequences[i] += 1;
            memcpy(answers[i] + 12, &tick, 4);
            uint32_t crc = crc32(answers[i], lengths[i] - 4u);
            memcpy(answers[i] + lengths[i] - 4, &crc, 4);
            sendto(link, answers[i], lengths[i], 0, (struct sockaddr *)&bench, sizeof bench);
            answered = 1;
        }
        if (!answered || (int32_t)tick < 0) continue;
        if (turned < MOST) turns[turned++] = now() - came;
        if (tick != last_tick) {
            if (last > 0 && tick == last_tick + 1 && seen < MOST) intervals[seen++] = came - last;
            last = came;
            last_tick = tick;
        }
    }
    printf("{");
    print("interval", intervals, seen);
    printf(",");
    print("turn", turns, turned);
    printf("}\n");
    return 0;
}
