#include "base/process.h"

#include "base/grow.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <spawn.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

extern char **environ;

static const size_t most_output = (size_t)64 << 20;

/* The ends that stay here. The program's input is a socket because a socket can be written without
 * SIGPIPE (MSG_NOSIGNAL) and so without touching the signals of the whole process. */
struct ends {
    int input;
    int output;
    int complaint;
};

/* What is under way. */
struct transfer {
    struct ends ends;
    const char *input;
    size_t left;
    size_t capacity;
    struct wa_process_output *output;
    size_t complaint_length;
};

static void close_end(int *descriptor)
{
    if (*descriptor >= 0) {
        close(*descriptor);
        *descriptor = -1;
    }
}

static int start(const char *const *arguments, const int theirs[3], pid_t *process)
{
    posix_spawn_file_actions_t actions;
    posix_spawnattr_t attributes;
    sigset_t signals;
    if (posix_spawn_file_actions_init(&actions) != 0) {
        return ENOMEM;
    }
    if (posix_spawnattr_init(&attributes) != 0) {
        posix_spawn_file_actions_destroy(&actions);
        return ENOMEM;
    }
    int failed = 0;
    for (int i = 0; i < 3 && failed == 0; i++) {
        failed = posix_spawn_file_actions_adddup2(&actions, theirs[i], i);
    }
    sigemptyset(&signals);
    posix_spawnattr_setsigmask(&attributes, &signals);
    sigaddset(&signals, SIGPIPE);
    posix_spawnattr_setsigdefault(&attributes, &signals);
    posix_spawnattr_setflags(&attributes, POSIX_SPAWN_SETSIGMASK | POSIX_SPAWN_SETSIGDEF);
    if (failed == 0) {
        failed = posix_spawnp(process, arguments[0], &actions, &attributes,
                              (char *const *)(uintptr_t)arguments, environ);
    }
    posix_spawnattr_destroy(&attributes);
    posix_spawn_file_actions_destroy(&actions);
    return failed;
}

/* Start the program with all its ends connected. Returns 0 or an errno. */
static int connect_and_start(const char *const *arguments, struct ends *ends, pid_t *process)
{
    int input[2] = {-1, -1}, output[2] = {-1, -1}, complaint[2] = {-1, -1};
    int failed = 0;
    if (socketpair(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0, input) != 0 ||
        pipe2(output, O_CLOEXEC) != 0 || pipe2(complaint, O_CLOEXEC) != 0) {
        failed = errno;
    }
    if (failed == 0) {
        const int theirs[3] = {input[1], output[1], complaint[1]};
        failed = start(arguments, theirs, process);
    }
    close_end(&input[1]);
    close_end(&output[1]);
    close_end(&complaint[1]);
    *ends = (struct ends){input[0], output[0], complaint[0]};
    return failed;
}

static bool take_output(struct transfer *transfer)
{
    struct wa_process_output *output = transfer->output;
    if (output->size > most_output ||
        !wa_grow(&output->bytes, &transfer->capacity, output->size + 65537, 1)) {
        return false;
    }
    const ssize_t got = read(transfer->ends.output, output->bytes + output->size, 65536);
    if (got > 0) {
        output->size += (size_t)got;
    } else if (got == 0 || errno != EINTR) {
        close_end(&transfer->ends.output);
    }
    output->bytes[output->size] = '\0';
    return true;
}

/* The first line is kept; the rest is read so that the program does not block on it. */
static void take_complaint(struct transfer *transfer)
{
    char bytes[1024];
    const ssize_t got = read(transfer->ends.complaint, bytes, sizeof bytes);
    if (got == 0 || (got < 0 && errno != EINTR)) {
        close_end(&transfer->ends.complaint);
    }
    char *kept = transfer->output->complaint;
    for (ssize_t i = 0; i < got; i++) {
        const bool blank = (unsigned char)bytes[i] < ' ';
        if (transfer->complaint_length + 1 < sizeof transfer->output->complaint &&
            !(blank && transfer->complaint_length == 0)) {
            kept[transfer->complaint_length++] = blank ? ' ' : bytes[i];
            kept[transfer->complaint_length] = '\0';
        }
    }
}

static void give_input(struct transfer *transfer)
{
    const ssize_t sent =
        send(transfer->ends.input, transfer->input, transfer->left, MSG_NOSIGNAL | MSG_DONTWAIT);
    if (sent >= 0) {
        transfer->input += sent;
        transfer->left -= (size_t)sent;
    } else if (errno != EINTR && errno != EAGAIN) {
        transfer->left = 0; /* it reads no more; its exit status tells why */
    }
    if (transfer->left == 0) {
        close_end(&transfer->ends.input);
    }
}

static long milliseconds_left(const struct timespec *end)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (end->tv_sec - now.tv_sec) * 1000 + (end->tv_nsec - now.tv_nsec) / 1000000;
}

/* Move bytes until the program has closed its ends. Returns NULL, or what went wrong. */
static const char *carry(struct transfer *transfer, int seconds)
{
    struct timespec end;
    clock_gettime(CLOCK_MONOTONIC, &end);
    end.tv_sec += seconds;
    while (transfer->ends.output >= 0 || transfer->ends.complaint >= 0) {
        struct pollfd waits[3] = {
            {.fd = transfer->ends.input, .events = POLLOUT},
            {.fd = transfer->ends.output, .events = POLLIN},
            {.fd = transfer->ends.complaint, .events = POLLIN},
        };
        const long left = milliseconds_left(&end);
        if (left <= 0) {
            return "it took too long";
        }
        if (poll(waits, 3, (int)left) < 0 && errno != EINTR) {
            return "it could not be waited for";
        }
        if (waits[0].revents != 0) {
            give_input(transfer);
        }
        if (waits[1].revents != 0 && !take_output(transfer)) {
            return "its answer does not fit into memory";
        }
        if (waits[2].revents != 0) {
            take_complaint(transfer);
        }
    }
    return NULL;
}

static int wait_for(pid_t process)
{
    int status = 0;
    while (waitpid(process, &status, 0) < 0) {
        if (errno != EINTR) {
            return -1;
        }
    }
    return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

enum wa_status wa_process_run(const char *const *arguments, const char *input, size_t input_size,
                              int seconds, struct wa_process_output *output, struct wa_error *error)
{
    pid_t process = -1;
    *output = (struct wa_process_output){.bytes = NULL};
    struct transfer transfer = {.input = input, .left = input_size, .output = output};
    const int failed = connect_and_start(arguments, &transfer.ends, &process);
    const char *reason = NULL;
    int exit_status = 0;
    if (failed == 0) {
        reason = carry(&transfer, seconds);
        if (reason != NULL) {
            kill(process, SIGKILL);
        }
        exit_status = wait_for(process);
    }
    close_end(&transfer.ends.input);
    close_end(&transfer.ends.output);
    close_end(&transfer.ends.complaint);
    if (failed == 0 && reason == NULL && exit_status == 0) {
        return WA_OK;
    }
    free(output->bytes);
    output->bytes = NULL;
    output->size = 0;
    output->missing = failed == ENOENT || exit_status == 127;
    if (failed != 0) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0, "The program %s cannot be started: %s.",
                       arguments[0], strerror(failed));
    }
    return wa_fail(error, WA_ERROR_FILE, NULL, 0, "The program %s failed: %s.", arguments[0],
                   reason != NULL                 ? reason
                   : output->complaint[0] != '\0' ? output->complaint
                                                  : "it gave no reason");
}
