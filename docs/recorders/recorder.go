// Package recorder records what the clients of a store ask of it, as a history that `misread check` reads. Go 1.20 or newer.
//
//	rec, err := recorder.New("drill.ndjson", recorder.Options{RefusedWhen: isRefusal})
//	gate := rec.Client("gate-1") // one for each goroutine
//	value := rec.UniqueValue("vessel")
//	err = gate.Write("berth/2", value, func() error { return store.Set("berth/2", value) })
//	got, err := gate.Read("berth/2", func() (any, error) { return store.Get("berth/2") }) // nil for absence
//
// The opening half of each record is with the operating system before its request is sent: a kill loses no request.
package recorder

import (
	"bytes"
	"crypto/rand"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"strconv"
	"sync"
	"sync/atomic"
	"time"
	"unicode/utf8"
)

// time.Now carries a monotonic reading, which time.Since uses: wall time is looked at once.
var anchor = time.Now()
var clock = clockName()

func now() int64 { return anchor.UnixNano() + int64(time.Since(anchor)) }

func random() string {
	b := make([]byte, 3)
	if _, err := rand.Read(b); err != nil {
		panic(err)
	}
	return hex.EncodeToString(b)
}

func clockName() string {
	name, err := os.Hostname()
	if err != nil {
		name = "host"
	}
	return fmt.Sprintf("%s-%d-%s", name, os.Getpid(), random())
}

type Options struct {
	Title        string
	ClockErrorNs int64
	// RefusedWhen is true for errors that prove that nothing happened; without it every error is unsure.
	RefusedWhen func(error) bool
}

type Recorder struct {
	Run         string
	file        *os.File
	refusedWhen func(error) bool
	lock        sync.Mutex
	failure     error
	names       map[string]bool
	ids, values atomic.Int64
}

// New begins a recording. The file must not exist: nothing is written over.
func New(path string, options Options) (*Recorder, error) {
	file, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL|os.O_APPEND, 0o666)
	if err != nil {
		return nil, err
	}
	run := strconv.FormatInt(time.Now().UnixMilli(), 36) + random()
	r := &Recorder{Run: run, file: file, refusedWhen: options.RefusedWhen, names: map[string]bool{}}
	title, err := text(options.Title)
	if err == nil {
		err = r.write(fmt.Sprintf(`{"history":1,"title":%s,"clockError":%d}`, title, options.ClockErrorNs))
	}
	return r, err
}

// Client is one sequential requester; its name is made unique to this run. Panics when the name was taken before.
func (r *Recorder) Client(name string) *Client {
	r.lock.Lock()
	defer r.lock.Unlock()
	if r.names[name] {
		panic("the client " + name + " exists already: give each concurrent requester its own name")
	}
	r.names[name] = true
	return &Client{Name: name + "@" + r.Run, recorder: r}
}

// UniqueValue is a value that no run ever repeats.
func (r *Recorder) UniqueValue(prefix string) string {
	return fmt.Sprintf("%s-%s-%d", prefix, r.Run, r.values.Add(1))
}

// Mark says that something happened to the store. Call what it returns when that is over.
func (r *Recorder) Mark(what string) (over func() error, err error) {
	name, err := text(what)
	if err != nil {
		return nil, err
	}
	begun := fmt.Sprintf(`{"mark":%s,"start":%d`, name, now())
	return func() error { return r.write(fmt.Sprintf(`%s,"end":%d}`, begun, now())) }, r.write(begun + "}")
}

func (r *Recorder) Close() error {
	r.lock.Lock()
	defer r.lock.Unlock()
	if r.failure == nil {
		r.failure = errors.New("this recorder is closed")
	}
	return errors.Join(r.file.Sync(), r.file.Close())
}

func (r *Recorder) write(line string) error {
	r.lock.Lock()
	defer r.lock.Unlock()
	if r.failure == nil { // nothing may follow a line that was lost
		_, r.failure = r.file.WriteString(line + "\n")
	}
	return r.failure
}

// text is the JSON of a value: nil, bool, string, an integer, or json.RawMessage for anything else.
func text(value any) (string, error) {
	switch v := value.(type) {
	case string:
		if !utf8.ValidString(v) {
			return "", fmt.Errorf("found %q as a value to record, expected UTF-8", v)
		}
	case json.RawMessage:
		var line bytes.Buffer
		err := json.Compact(&line, v)
		return line.String(), err
	case nil, bool, int, int8, int16, int32, int64, uint, uint8, uint16, uint32, uint64:
	default:
		return "", fmt.Errorf("found %T as a value to record, expected a string, an integer or json.RawMessage", v)
	}
	b, err := json.Marshal(value)
	return string(b), err
}

type Client struct {
	Name     string
	recorder *Recorder
	busy     atomic.Bool
}

// Read records a read; request answers the value, nil for absence.
func (c *Client) Read(key string, request func() (any, error)) (value any, err error) {
	err = c.run("read", key, nil, func() ([]field, error) {
		value, err = request()
		return []field{{"value", value}}, err
	})
	return value, err
}

func (c *Client) Write(key string, value any, request func() error) error {
	return c.run("write", key, []field{{"value", value}}, func() ([]field, error) { return nil, request() })
}

// WriteFrom records a write that was computed from basis, a value read earlier.
func (c *Client) WriteFrom(key string, basis, value any, request func() error) error {
	fields := []field{{"value", value}, {"basis", basis}}
	return c.run("write", key, fields, func() ([]field, error) { return nil, request() })
}

// Increment records an increment; request answers the count after it, or nil where the store does not say.
func (c *Client) Increment(key string, by int64, request func() (*int64, error)) error {
	return c.run("increment", key, []field{{"by", by}}, func() ([]field, error) {
		count, err := request()
		if count == nil {
			return nil, err
		}
		return []field{{"value", *count}}, err
	})
}

// CasAnswer: Told where the store says what it found instead, Saw.
type CasAnswer struct {
	Applied, Told bool
	Saw           any
}

func (c *Client) Cas(key string, expect, value any, request func() (CasAnswer, error)) error {
	return c.run("cas", key, []field{{"expect", expect}, {"value", value}}, func() ([]field, error) {
		answer, err := request()
		if !answer.Applied && answer.Told {
			return []field{{"applied", false}, {"saw", answer.Saw}}, err
		}
		return []field{{"applied", answer.Applied}}, err
	})
}

func (c *Client) Delete(key string, request func() error) error {
	return c.run("delete", key, nil, func() ([]field, error) { return nil, request() })
}

type field struct {
	name  string
	value any
}

func join(fields []field) (line string, err error) {
	for _, f := range fields {
		value, err := text(f.value)
		if err != nil {
			return "", err
		}
		line += `,"` + f.name + `":` + value
	}
	return line, nil
}

func (c *Client) run(op, key string, fields []field, request func() ([]field, error)) (err error) {
	if !c.busy.CompareAndSwap(false, true) {
		return errors.New("the client " + c.Name + " has a request in flight: one at a time a client")
	}
	defer c.busy.Store(false)
	r := c.recorder
	more, err := join(append([]field{{"client", c.Name}, {"host", clock}, {"op", op}, {"key", key}}, fields...))
	if err != nil {
		return err
	}
	id := fmt.Sprintf("%s-%d", r.Run, r.ids.Add(1))
	if err = r.write(fmt.Sprintf(`{"id":"%s"%s,"start":%d}`, id, more, now())); err != nil {
		return err
	}
	// What a panic leaves behind, too.
	closing, end := `,"outcome":"unsure"`, int64(0)
	defer func() {
		if end == 0 {
			end = now()
		}
		err = errors.Join(err, r.write(fmt.Sprintf(`{"id":"%s","end":%d%s}`, id, end, closing)))
	}()
	answer, err := request()
	end = now()
	if err != nil {
		if r.refusedWhen != nil && r.refusedWhen(err) {
			closing = `,"outcome":"refused"`
		}
		return err
	}
	// An answer that cannot be recorded is no answer to hold the store to: it stays unsure.
	told, err := join(answer)
	if err == nil {
		closing = told
	}
	return err
}
