// Drives docs/recorders/recorder.go against a store in memory. drive.py and Drive.java do the same, step by step.
package main

import (
	"errors"
	"fmt"
	"os"
	"sync"

	"drive/recorder"
)

var errRefused = errors.New("no")

func must(err error) {
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
}

func expectError(what string, err error) {
	if err == nil {
		must(errors.New(what + ": expected an error"))
	}
}

func main() {
	path := os.Args[1]
	rec, err := recorder.New(path, recorder.Options{
		Title: "drive", ClockErrorNs: 1000, RefusedWhen: func(err error) bool { return errors.Is(err, errRefused) },
	})
	must(err)
	var lock sync.Mutex
	store, boarded := map[string]any{}, int64(0)
	none := func() error { return nil }
	answer := func(value any) func() (any, error) { return func() (any, error) { return value, nil } }

	over, err := rec.Mark(`node "4" stopped`)
	must(err)
	var group sync.WaitGroup
	for i := 0; i < 4; i++ {
		gate, key := rec.Client(fmt.Sprintf("gate-%d", i)), fmt.Sprintf("berth/%d", i)
		group.Add(1)
		go func() {
			defer group.Done()
			for n := 0; n < 25; n++ {
				value := rec.UniqueValue("vessel")
				must(gate.Write(key, value, func() error {
					lock.Lock()
					defer lock.Unlock()
					store[key] = value
					return nil
				}))
				_, err := gate.Read(key, func() (any, error) {
					lock.Lock()
					defer lock.Unlock()
					return store[key], nil
				})
				must(err)
				must(gate.Increment("boarded", 2, func() (*int64, error) {
					lock.Lock()
					defer lock.Unlock()
					boarded += 2
					count := boarded
					return &count, nil
				}))
			}
		}()
	}
	group.Wait()
	must(over())

	desk := rec.Client("desk")
	big, tricky := uint64(18446744073709551615), "\"\\\u0001\n\u00e9\U0001d11e"
	read := func(key string, value any) error {
		got, err := desk.Read(key, answer(value))
		if err == nil && got != value {
			err = fmt.Errorf("%s: got %v", key, got)
		}
		return err
	}
	cas := func(expect, value any, answer recorder.CasAnswer) error {
		return desk.Cas("lease", expect, value, func() (recorder.CasAnswer, error) { return answer, nil })
	}
	must(desk.Write("big", big, none))
	must(read("big", big))
	must(desk.Write("tricky", tricky, none))
	must(read("tricky", tricky))
	must(desk.WriteFrom("lease", nil, "a", none))
	must(cas("a", "b", recorder.CasAnswer{Applied: true}))
	must(cas("a", "c", recorder.CasAnswer{Told: true, Saw: "b"}))
	must(desk.Delete("lease", none))
	must(read("lease", nil))
	must(desk.Increment("waiting", -1, func() (*int64, error) { return nil, nil }))
	expectError("a refusal", desk.Write("lease", "d", func() error { return errRefused }))
	expectError("a time-out", desk.Write("lease", "e", func() error { return os.ErrDeadlineExceeded }))
	expectError("bytes", func() error { _, err := desk.Read("raw", answer([]byte("bytes"))); return err }())
	expectError("one name twice", func() (err error) {
		defer func() {
			if recover() != nil {
				err = errors.New("refused")
			}
		}()
		rec.Client("desk")
		return nil
	}())
	_, err = recorder.New(path, recorder.Options{})
	expectError("a file that exists", err)

	_, err = rec.Mark("never over")
	must(err)
	late, sent := rec.Client("late"), make(chan bool)
	go late.Write("late", "f", func() error {
		close(sent)
		select {}
	})
	<-sent
	_, err = late.Read("late", answer(nil))
	expectError("two at a time", err)
	os.Exit(0)
}
