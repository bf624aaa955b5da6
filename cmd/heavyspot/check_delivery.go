package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"net"
	"os"
	"path/filepath"

	"heavyspot/config"
	"heavyspot/publish/buffer"
)

// buffer looks at the buffer's file and says whether another process, the
// daemon, holds it. Nothing is written to it.
func (l *checkList) buffer(cfg *config.Config) (held bool) {
	path := cfg.BufferPath()
	if err := tryFolder(filepath.Dir(path)); err != nil {
		l.step(toMend, "buffer", "%s cannot be kept: %v; give the user that runs heavyspot a folder it may write to", path, err)
		return false
	}
	opt := bufferOptions(cfg)
	opt.ReadOnly = true
	box, err := buffer.Open(path, opt)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		l.step(isOK, "buffer", "%s will be made, up to %d MB, minutes for %d days", path, cfg.Buffer.MaxMB, cfg.Buffer.KeepDays)
	case errors.Is(err, buffer.ErrHeld):
		l.step(isNote, "buffer", "%s is in use: heavyspot runs for this machine", path)
		held = true
	case err != nil:
		l.step(toMend, "buffer", "%v; when heavyspot starts it sets the file aside and begins a new one", err)
	default:
		sequence, boot := box.Numbers()
		l.step(isOK, "buffer", "%s holds messages up to number %d of %s, %d wait for a broker", path, sequence, several(int(boot), "start"), box.Waiting())
		box.Close()
	}
	l.space(path, int64(cfg.Buffer.MaxMB)<<20)
	return held
}

// space says whether the buffer's file can grow to its greatest size.
func (l *checkList) space(path string, most int64) {
	free, ok := freeBytes(filepath.Dir(path))
	if !ok {
		return
	}
	if info, err := os.Stat(path); err == nil {
		most -= info.Size()
	}
	if free < most {
		l.step(toMend, "space", "%d MB are free for the buffer, which may grow by %d MB; make room or lower buffer.max_mb", free>>20, most>>20)
		return
	}
	l.step(isOK, "space", "%d MB are free, the buffer may grow by %d MB", free>>20, max(0, most>>20))
}

// tryFolder says whether a file can be made in a folder.
func tryFolder(folder string) error {
	f, err := os.CreateTemp(folder, ".heavyspot-check-")
	if err != nil {
		return err
	}
	return errors.Join(f.Close(), os.Remove(f.Name()))
}

// broker tries the brokers, or the address that the embedded one would listen on.
func (l *checkList) broker(ctx context.Context, cfg *config.Config, held bool) {
	if err := checkFiles(cfg); err != nil {
		l.step(toMend, "broker", "%v", err)
		return
	}
	if len(cfg.MQTT.Brokers) == 0 {
		l.embedded(cfg.MQTT.EmbeddedListen, held)
		return
	}
	reached := 0
	failed := make([]string, 0, len(cfg.MQTT.Brokers))
	for _, b := range cfg.MQTT.Brokers {
		if err := tryBroker(ctx, cfg, b); err != nil {
			failed = append(failed, fmt.Sprintf("%s: %v", b, err))
			continue
		}
		reached++
		l.step(isOK, "broker", "%s lets this client in", b)
	}
	for _, text := range failed {
		o := toMend
		if reached > 0 {
			o = isNote
		}
		l.step(o, "broker", "%s", text)
	}
}

// embedded tries the address of the embedded broker.
func (l *checkList) embedded(address string, held bool) {
	listener, err := net.Listen("tcp", address)
	switch {
	case err == nil:
		listener.Close()
		l.step(isOK, "broker", "the embedded one can listen on %s, for clients on this board", address)
	case held:
		l.step(isOK, "broker", "%s is in use, as it should be while heavyspot runs", address)
	default:
		l.step(toMend, "broker", "the embedded one cannot listen on %s: %v; choose another mqtt.embedded_listen, or name the broker that runs there in mqtt.brokers", address, err)
	}
}
