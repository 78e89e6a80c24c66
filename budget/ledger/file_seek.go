package ledger

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"io"
	"os"

	"budgetcheck/budget/unit"
)

// whole is where the last whole booking of a file ends. A process that was
// killed may have left a part of a line behind it, or only some lines of its
// booking; neither was confirmed.
func whole(f *os.File) (int64, error) {
	info, err := f.Stat()
	if err != nil {
		return 0, err
	}
	end, err := lineStart(f, info.Size())
	for end > 0 && err == nil {
		var start int64
		var text []byte
		if start, text, err = lineBefore(f, end); err != nil {
			return 0, err
		}
		if l, unread := parse(text); l.more == 0 || unread != nil && !errors.Is(unread, errKind) {
			return end, nil
		}
		end = start
	}
	return end, err
}

// lastBooked is when the last line that can be read was booked; the line before
// the first was booked at the beginning of time.
func lastBooked(f io.ReaderAt, end int64) (unit.Instant, error) {
	const beginning = unit.Instant(-1 << 63)
	for end > 0 {
		start, text, err := lineBefore(f, end)
		if err != nil {
			return 0, err
		}
		if at, ok := bookedAt(text); ok {
			return at, nil
		}
		end = start
	}
	return beginning, nil
}

// lineBefore is the line that ends, with its newline, at end.
func lineBefore(f io.ReaderAt, end int64) (start int64, text []byte, err error) {
	if start, err = lineStart(f, end-1); err != nil {
		return 0, nil, err
	}
	text = make([]byte, end-1-start)
	_, err = f.ReadAt(text, start)
	return start, text, err
}

// lineStart is where the line begins that the byte at `at` would be of: after
// the last newline before it.
func lineStart(f io.ReaderAt, at int64) (int64, error) {
	const most = 16 << 10
	for at > 0 {
		chunk := make([]byte, min(at, most))
		if _, err := f.ReadAt(chunk, at-int64(len(chunk))); err != nil {
			return 0, err
		}
		if n := bytes.LastIndexByte(chunk, '\n'); n >= 0 {
			return at - int64(len(chunk)-n-1), nil
		}
		at -= int64(len(chunk))
	}
	return 0, nil
}

// seek is where the first line begins that was booked at since or later, or
// end: by bisection, for lines are in order of booking.
func seek(f io.ReaderAt, end int64, since unit.Instant) (int64, error) {
	low, high := int64(0), end
	for low < high {
		middle := low + (high-low)/2
		start, next, at, err := lineFrom(f, middle, end)
		switch {
		case err != nil:
			return 0, err
		case start == end || at >= since:
			high = middle
		default:
			low = min(next, high)
		}
	}
	start, _, _, err := lineFrom(f, low, end)
	return start, err
}

// lineFrom is the first line with a time of booking that begins at `at` or
// later, where the line after it begins, and when it was booked; start is end
// if there is none.
func lineFrom(f io.ReaderAt, at, end int64) (start, next int64, booked unit.Instant, err error) {
	const usual = 4 << 10
	from := max(at-1, 0) // the newline before it, where at is the start of a line
	lines := bufio.NewReaderSize(io.NewSectionReader(f, from, end-from), usual)
	start = at
	if at > 0 {
		rest, err := lines.ReadSlice('\n')
		for start = from + int64(len(rest)); errors.Is(err, bufio.ErrBufferFull); start += int64(len(rest)) {
			rest, err = lines.ReadSlice('\n')
		}
		if err != nil {
			return end, end, 0, except(err, io.EOF)
		}
	}
	for start < end {
		text, err := lines.ReadBytes('\n')
		if err != nil {
			return end, end, 0, except(err, io.EOF)
		}
		next = start + int64(len(text))
		if booked, ok := bookedAt(text[:len(text)-1]); ok {
			return start, next, booked, nil
		}
		start = next
	}
	return end, end, 0, nil
}

// except is err, but nil where it is what was to be expected.
func except(err, expected error) error {
	if errors.Is(err, expected) {
		return nil
	}
	return err
}

// eachLine gives the lines between two places, without their newlines, and
// where each begins. The text is that of the call alone.
func eachLine(ctx context.Context, f io.ReaderAt, from, end int64, take func(at int64, text []byte)) error {
	const block = 256 << 10
	lines := bufio.NewReaderSize(io.NewSectionReader(f, from, end-from), block)
	for n := 0; from < end; n++ {
		const often = 1024
		if n%often == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
		text, err := lines.ReadSlice('\n')
		if errors.Is(err, bufio.ErrBufferFull) {
			var rest []byte
			long := bytes.Clone(text)
			rest, err = lines.ReadBytes('\n')
			text = append(long, rest...)
		}
		if err != nil {
			return err
		}
		take(from, text[:len(text)-1])
		from += int64(len(text))
	}
	return nil
}

// number is the number of the line that begins at `at`, from 1; 0 where it
// cannot be told.
func number(f io.ReaderAt, at int64) int {
	n := 1
	err := eachLine(context.Background(), f, 0, at, func(int64, []byte) { n++ })
	if err != nil {
		return 0
	}
	return n
}
