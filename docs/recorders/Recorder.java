import java.io.IOException;
import java.math.BigInteger;
import java.net.InetAddress;
import java.nio.ByteBuffer;
import java.nio.channels.FileChannel;
import java.nio.charset.StandardCharsets;
import java.nio.file.Path;
import java.nio.file.StandardOpenOption;
import java.security.SecureRandom;
import java.time.Instant;
import java.util.Set;
import java.util.concurrent.Callable;
import java.util.concurrent.ConcurrentHashMap;
import java.util.concurrent.atomic.AtomicBoolean;
import java.util.concurrent.atomic.AtomicLong;
import java.util.function.Function;
import java.util.function.Predicate;

/**
 * Records what the clients of a store ask of it, as a history that {@code misread check} reads. Java 17 or newer.
 *
 * <pre>{@code
 * Recorder recorder = new Recorder(Path.of("drill.ndjson"), "failover drill", 0, error -> error instanceof Refused);
 * Recorder.Client gate = recorder.client("gate-1"); // one for each thread
 * String value = recorder.uniqueValue("vessel");
 * gate.write("berth/2", value, () -> store.set("berth/2", value));
 * gate.read("berth/2", () -> store.get("berth/2")); // null for absence
 * }</pre>
 *
 * The opening half of each record is with the operating system before its request is sent: a kill loses no request.
 */
public final class Recorder implements AutoCloseable {
    private static final long MONOTONIC = System.nanoTime();
    private static final Instant WALL = Instant.now();
    private static final long ANCHOR = WALL.getEpochSecond() * 1_000_000_000L + WALL.getNano();
    private static final String CLOCK = hostName() + "-" + ProcessHandle.current().pid() + "-" + random();

    private final String run = Long.toString(System.currentTimeMillis(), 36) + random();
    private final FileChannel file;
    private final Predicate<Throwable> refusedWhen;
    private final Set<String> names = ConcurrentHashMap.newKeySet();
    private final AtomicLong ids = new AtomicLong();
    private final AtomicLong values = new AtomicLong();
    private IOException failure;

    /** {@code refusedWhen}: true for errors that prove that nothing happened; all others are unsure. */
    public Recorder(Path path, String title, long clockErrorNs, Predicate<Throwable> refusedWhen) throws IOException {
        this.refusedWhen = refusedWhen;
        // Never writes over or behind another recording.
        file = FileChannel.open(path, StandardOpenOption.CREATE_NEW, StandardOpenOption.WRITE);
        put("{\"history\":1,\"title\":" + text(title) + ",\"clockError\":" + clockErrorNs + "}");
    }

    /** One sequential requester. Its name is made unique to this run. */
    public Client client(String name) {
        if (!names.add(name))
            throw new IllegalArgumentException(
                    "the client " + name + " exists already: give each concurrent requester its own name");
        return new Client(name + "@" + run);
    }

    /** A value that no run ever repeats. */
    public String uniqueValue(String prefix) {
        return prefix + "-" + run + "-" + values.incrementAndGet();
    }

    /** Something happened to the store. Close what it returns when that is over. */
    public Mark mark(String what) throws IOException {
        String begun = "{\"mark\":" + text(what) + ",\"start\":" + now();
        put(begun + "}");
        return () -> put(begun + ",\"end\":" + now() + "}");
    }

    public interface Mark extends AutoCloseable {
        @Override
        void close() throws IOException;
    }

    /** What a cas came to; {@code told} where the store says what it found instead, {@code saw}. */
    public record CasAnswer(boolean applied, boolean told, Object saw) {}

    @Override
    public synchronized void close() throws IOException {
        if (failure == null) failure = new IOException("this recorder is closed");
        file.force(true);
        file.close();
    }

    private synchronized void put(String line) throws IOException {
        if (failure != null) throw failure; // nothing may follow a line that was lost
        try {
            ByteBuffer bytes = ByteBuffer.wrap((line + "\n").getBytes(StandardCharsets.US_ASCII));
            while (bytes.hasRemaining()) file.write(bytes);
        } catch (IOException error) {
            failure = error;
            throw error;
        }
    }

    /** The JSON of a value: null, Boolean, String or a whole number. */
    private static String text(Object value) {
        if (value == null || value instanceof Boolean) return String.valueOf(value);
        if (value instanceof Integer || value instanceof Long || value instanceof BigInteger) return value.toString();
        if (!(value instanceof String string))
            throw new IllegalArgumentException(
                    "found " + value.getClass() + " as a value to record, expected a String or a whole number");
        StringBuilder out = new StringBuilder("\"");
        for (int i = 0; i < string.length(); i++) {
            char c = string.charAt(i);
            if (c == '"' || c == '\\') out.append('\\').append(c);
            else if (c < ' ' || c > '~') out.append(String.format("\\u%04x", (int) c));
            else out.append(c);
        }
        return out.append('"').toString();
    }

    private static long now() {
        return ANCHOR + (System.nanoTime() - MONOTONIC);
    }

    private static String random() {
        return String.format("%06x", new SecureRandom().nextInt(1 << 24));
    }

    private static String hostName() {
        try {
            return InetAddress.getLocalHost().getHostName();
        } catch (IOException unknown) {
            return "host";
        }
    }

    public final class Client {
        public final String name;
        private final AtomicBoolean busy = new AtomicBoolean();

        private Client(String name) {
            this.name = name;
        }

        public <T> T read(String key, Callable<T> request) throws Exception {
            return run("read", key, "", request, value -> ",\"value\":" + text(value));
        }

        public <T> T write(String key, Object value, Callable<T> request) throws Exception {
            return run("write", key, ",\"value\":" + text(value), request, done -> "");
        }

        /** {@code basis}: the value, read earlier, that this one was computed from. */
        public <T> T write(String key, Object value, Object basis, Callable<T> request) throws Exception {
            return run("write", key, ",\"value\":" + text(value) + ",\"basis\":" + text(basis), request, done -> "");
        }

        /** {@code request} answers the count after it, or null where the store does not say. */
        public Long increment(String key, long by, Callable<Long> request) throws Exception {
            return run("increment", key, ",\"by\":" + by, request, n -> n == null ? "" : ",\"value\":" + n);
        }

        public CasAnswer cas(String key, Object expect, Object value, Callable<CasAnswer> request) throws Exception {
            String fields = ",\"expect\":" + text(expect) + ",\"value\":" + text(value);
            return run("cas", key, fields, request, answer -> ",\"applied\":" + answer.applied()
                    + (answer.applied() || !answer.told() ? "" : ",\"saw\":" + text(answer.saw())));
        }

        public <T> T delete(String key, Callable<T> request) throws Exception {
            return run("delete", key, "", request, done -> "");
        }

        private <T> T run(String op, String key, String fields, Callable<T> request, Function<T, String> told)
                throws Exception {
            if (!busy.compareAndSet(false, true))
                throw new IllegalStateException("the client " + name + " has a request in flight: one at a time a client");
            try {
                String id = run + "-" + ids.incrementAndGet();
                put("{\"id\":\"" + id + "\",\"client\":" + text(name) + ",\"host\":" + text(CLOCK) + ",\"op\":\"" + op
                        + "\",\"key\":" + text(key) + fields + ",\"start\":" + now() + "}");
                // What stays of an error, and of an answer that cannot be recorded.
                String closing = ",\"outcome\":\"unsure\"";
                long end = 0;
                try {
                    T answer = request.call();
                    end = now();
                    closing = told.apply(answer);
                    return answer;
                } catch (Throwable error) {
                    if (end == 0) {
                        end = now();
                        if (refusedWhen.test(error)) closing = ",\"outcome\":\"refused\"";
                    }
                    throw error;
                } finally {
                    put("{\"id\":\"" + id + "\",\"end\":" + end + closing + "}");
                }
            } finally {
                busy.set(false);
            }
        }
    }
}
