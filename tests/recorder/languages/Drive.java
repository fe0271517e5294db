import java.math.BigInteger;
import java.nio.file.FileAlreadyExistsException;
import java.nio.file.Path;
import java.util.ArrayList;
import java.util.List;
import java.util.Map;
import java.util.Objects;
import java.util.concurrent.Callable;
import java.util.concurrent.ConcurrentHashMap;
import java.util.concurrent.CountDownLatch;
import java.util.concurrent.TimeoutException;
import java.util.concurrent.atomic.AtomicLong;

/** Drives docs/recorders/Recorder.java against a store in memory. drive.py and drive.go do the same, step by step. */
public final class Drive {
    static final class Refused extends Exception {}

    static void expectError(String what, Class<? extends Exception> kind, Callable<?> call) {
        try {
            call.call();
        } catch (Exception error) {
            if (kind.isInstance(error)) return;
            error.printStackTrace();
        }
        System.err.println(what + ": expected an error");
        Runtime.getRuntime().halt(1);
    }

    static <T> void expect(T expected, T found) {
        if (!Objects.equals(expected, found)) throw new IllegalStateException("found " + found);
    }

    public static void main(String[] args) throws Exception {
        Path path = Path.of(args[0]);
        Recorder recorder = new Recorder(path, "drive", 1000, error -> error instanceof Refused);
        Map<String, String> store = new ConcurrentHashMap<>();
        AtomicLong boarded = new AtomicLong();

        Recorder.Mark mark = recorder.mark("node \"4\" stopped");
        List<Thread> threads = new ArrayList<>();
        for (int i = 0; i < 4; i++) {
            Recorder.Client gate = recorder.client("gate-" + i);
            String key = "berth/" + i;
            threads.add(new Thread(() -> {
                try {
                    for (int n = 0; n < 25; n++) {
                        String value = recorder.uniqueValue("vessel");
                        gate.write(key, value, () -> store.put(key, value));
                        expect(value, gate.read(key, () -> store.get(key)));
                        gate.increment("boarded", 2, () -> boarded.addAndGet(2));
                    }
                } catch (Exception error) {
                    error.printStackTrace();
                    Runtime.getRuntime().halt(1);
                }
            }));
        }
        for (Thread thread : threads) thread.start();
        for (Thread thread : threads) thread.join();
        mark.close();

        Recorder.Client desk = recorder.client("desk");
        BigInteger big = new BigInteger("18446744073709551615");
        String tricky = "\"\\\u0001\n\u00e9\ud834\udd1e";
        desk.write("big", big, () -> null);
        expect(big, desk.read("big", () -> big));
        desk.write("tricky", tricky, () -> null);
        expect(tricky, desk.read("tricky", () -> tricky));
        desk.write("lease", "a", null, () -> null);
        desk.cas("lease", "a", "b", () -> new Recorder.CasAnswer(true, false, null));
        desk.cas("lease", "a", "c", () -> new Recorder.CasAnswer(false, true, "b"));
        desk.delete("lease", () -> null);
        expect(null, desk.read("lease", () -> null));
        desk.increment("waiting", -1, () -> null);
        expectError("a refusal", Refused.class, () -> desk.write("lease", "d", () -> { throw new Refused(); }));
        expectError("a time-out", TimeoutException.class,
                () -> desk.write("lease", "e", () -> { throw new TimeoutException(); }));
        expectError("bytes", IllegalArgumentException.class, () -> desk.read("raw", () -> new byte[] {1}));
        expectError("one name twice", IllegalArgumentException.class, () -> recorder.client("desk"));
        expectError("a file that exists", FileAlreadyExistsException.class, () -> new Recorder(path, "", 0, e -> false));

        recorder.mark("never over");
        Recorder.Client late = recorder.client("late");
        CountDownLatch sent = new CountDownLatch(1);
        Thread stuck = new Thread(() -> {
            try {
                late.write("late", "f", () -> {
                    sent.countDown();
                    new CountDownLatch(1).await();
                    return null;
                });
            } catch (Exception error) {
                error.printStackTrace();
            }
        });
        stuck.start();
        sent.await();
        expectError("two at a time", IllegalStateException.class, () -> late.read("late", () -> null));
        Runtime.getRuntime().halt(0);
    }
}
