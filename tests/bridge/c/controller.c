/*
 * A controller in C for the tests, over the generated header of tests/bridge/sample-map.ts.
 *
 *   controller pipe            datagrams on standard input and output, each behind a 16-bit length
 *   controller udp OWN PEER    loopback, lockstep: says hello, answers each `end` until the bench says hello a second time
 */
#include "messages.h"

#include <stdio.h>

static uint32_t newest_tick;
static uint32_t sequence;
static uint32_t control_sequence;
static struct oilspring_pressures pressures;
static double shaft_speed;

/* The answer to what is known now. */
static size_t answer(struct oilspring_requests *requests)
{
    oilspring_set_requests_torque(requests, oilspring_get_pressures_highPressure(&pressures) - oilspring_get_pressures_oilTemperature(&pressures) + shaft_speed / 100.0);
    oilspring_set_requests_isolationValve(requests, oilspring_get_pressures_energy(&pressures) > 0.0 ? OILSPRING_requests_isolationValve_open : OILSPRING_requests_isolationValve_shut);
    return oilspring_finish_requests(requests, sequence++, newest_tick);
}

/* Takes a sound datagram in; its kind and number in one. */
static int take(const unsigned char *bytes)
{
    struct oilspring_header header;
    memcpy(&header, bytes, sizeof header);
    newest_tick = header.tick;
    if (header.kind != OILSPRING_KIND_MESSAGE)
        return header.kind;
    if (header.message == OILSPRING_MESSAGE_pressures)
        memcpy(&pressures, bytes, sizeof pressures);
    if (header.message == OILSPRING_MESSAGE_speeds) {
        struct oilspring_speeds speeds;
        memcpy(&speeds, bytes, sizeof speeds);
        shaft_speed = oilspring_get_speeds_shaftSpeed(&speeds);
    }
    return OILSPRING_KIND_MESSAGE;
}

static void put(const void *datagram, size_t length)
{
    fputc((int)(length & 255u), stdout);
    fputc((int)(length >> 8), stdout);
    fwrite(datagram, 1, length, stdout);
}

static int over_pipe(void)
{
    static unsigned char bytes[65536];
    int low;
    while ((low = fgetc(stdin)) != EOF) {
        size_t length = (size_t)low | (size_t)fgetc(stdin) << 8;
        enum oilspring_verdict verdict;
        if (fread(bytes, 1, length, stdin) != length)
            return 1;
        verdict = oilspring_check(bytes, length);
        if (verdict == OILSPRING_SOUND && take(bytes) == OILSPRING_KIND_MESSAGE) {
            struct oilspring_requests requests;
            put(&requests, answer(&requests));
        } else {
            struct oilspring_control control;
            put(&control, oilspring_finish_control(&control, OILSPRING_KIND_HELLO, control_sequence++, (uint32_t)verdict));
        }
    }
    return 0;
}

#ifdef OVER_UDP
#include <arpa/inet.h>
#include <stdlib.h>
#include <sys/socket.h>
#include <unistd.h>

static int over_udp(int own, int peer)
{
    struct sockaddr_in here, there;
    struct oilspring_control control;
    unsigned char bytes[OILSPRING_GREATEST_LENGTH + 1];
    int hellos = 0;
    int file = socket(AF_INET, SOCK_DGRAM, 0);
    memset(&here, 0, sizeof here);
    here.sin_family = AF_INET;
    here.sin_port = htons((uint16_t)own);
    here.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    there = here;
    there.sin_port = htons((uint16_t)peer);
    if (file < 0 || bind(file, (struct sockaddr *)&here, sizeof here) < 0)
        return 2;
    if (connect(file, (struct sockaddr *)&there, sizeof there) < 0)
        return 3;
    if (send(file, &control, oilspring_finish_control(&control, OILSPRING_KIND_HELLO, control_sequence++, 0), 0) < 0)
        return 4;
    for (;;) {
        ssize_t length = recv(file, bytes, sizeof bytes, 0);
        int kind;
        if (length < 0)
            return 5;
        if (oilspring_check(bytes, (size_t)length) != OILSPRING_SOUND)
            continue;
        kind = take(bytes);
        if (kind == OILSPRING_KIND_HELLO && ++hellos == 2) {
            close(file);
            return 0;
        }
        if (kind == OILSPRING_KIND_END) {
            struct oilspring_requests requests;
            if (send(file, &requests, answer(&requests), 0) < 0)
                return 6;
            if (send(file, &control, oilspring_finish_control(&control, OILSPRING_KIND_DONE, control_sequence++, newest_tick), 0) < 0)
                return 7;
        }
    }
}
#endif

int main(int count, char **arguments)
{
#ifdef OVER_UDP
    if (count == 4 && strcmp(arguments[1], "udp") == 0)
        return over_udp(atoi(arguments[2]), atoi(arguments[3]));
#endif
    (void)count;
    (void)arguments;
    return over_pipe();
}
