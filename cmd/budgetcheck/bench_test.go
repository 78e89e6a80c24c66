package main

import (
	"bufio"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"testing"
	"time"

	"github.com/stretchr/testify/require"
)

// day is a record of eight meters, read once a second for a day, and a series
// of three days around it.
type day struct {
	record, series string
	size           int64
}

const dayLines = 8 * 24 * 60 * 60

// makeDay writes both.
func makeDay(b *testing.B) day {
	b.Helper()
	d := day{record: filepath.Join(b.TempDir(), "day.ndjson"), series: filepath.Join(b.TempDir(), "three-days.csv")}
	start := time.Date(2031, 3, 10, 0, 0, 0, 0, time.UTC)
	d.size = written(b, d.record, func(w io.Writer) {
		fmt.Fprintf(w, `{"k":"open","format":1,"run":"gauge-day","job":"retrain-tide","at":%q,"site":"quay-north","machine":"octet"}`+"\n", stamp(start))
		for second := range dayLines / 8 {
			at := stamp(start.Add(time.Duration(second) * time.Second))
			for meter := range 8 {
				watt := 250 + float64((second*7+meter*131)%1000)/8 // eighths: three decimals are exact
				fmt.Fprintf(w, `{"k":"power","at":%q,"meter":"gpu%d","w":%.3f}`+"\n", at, meter, watt)
			}
		}
		fmt.Fprintf(w, `{"k":"close","at":%q,"outcome":"ok"}`+"\n", stamp(start.Add(24*time.Hour)))
	})
	written(b, d.series, func(w io.Writer) {
		fmt.Fprintln(w, "zone,from,to,g_per_kwh,factor")
		for hour := range 72 {
			from := start.Add(time.Duration(hour-24) * time.Hour)
			fmt.Fprintf(w, "quay-north,%s,%s,%d,average\n", stamp(from), stamp(from.Add(time.Hour)), 200+hour)
		}
	})
	return d
}

func stamp(at time.Time) string { return at.Format(time.RFC3339) }

// written writes a file and gives its size.
func written(b *testing.B, path string, content func(io.Writer)) int64 {
	b.Helper()
	f, err := os.Create(path)
	require.NoError(b, err)
	w := bufio.NewWriter(f)
	content(w)
	require.NoError(b, w.Flush())
	info, err := f.Stat()
	require.NoError(b, err)
	require.NoError(b, f.Close())
	return info.Size()
}

// BenchmarkWeighFile weighs a day through the program, from its start to its
// end.
func BenchmarkWeighFile(b *testing.B) {
	d, program := makeDay(b), binary(b)
	b.SetBytes(d.size)
	var c cost
	for b.Loop() {
		run := exec.Command(program, "weigh", "-grid", d.series, d.record)
		run.Dir = filepath.Dir(d.series) // where there is no policy
		require.Equal(b, exitDone, c.of(b, run))
	}
	c.report(b)
	b.ReportMetric(float64(d.size)/1e6/c.used.Seconds()*float64(c.runs), "MB/s-cpu")
}

// BenchmarkGateDemo is what a gate costs a CI job, from its start to the
// written statement.
func BenchmarkGateDemo(b *testing.B) {
	program, out := binary(b), b.TempDir()
	var c cost
	for b.Loop() {
		run := exec.Command(program, "gate", "-branch", "main", "-head", "head/*", "-base", "base/*", "-now", "2031-03-10T12:00:00Z", "-out", out)
		run.Dir = demoDir
		require.Equal(b, exitFinding, c.of(b, run))
	}
	c.report(b)
}

// cost is what runs of the program took.
type cost struct {
	runs int
	used time.Duration // of processors, by the program and the system for it
	peak float64       // resident MiB; 0 where it is not told
}

// of runs the program once, adds its cost and gives its exit status.
func (c *cost) of(b *testing.B, run *exec.Cmd) int {
	b.Helper()
	require.NoError(b, run.Start())
	ended := make(chan struct{})
	peak := make(chan float64)
	go func() { peak <- watch(run.Process.Pid, ended) }()
	state, err := run.Process.Wait()
	close(ended)
	require.NoError(b, err)
	c.runs++
	c.used += state.UserTime() + state.SystemTime()
	c.peak = max(c.peak, <-peak)
	return state.ExitCode()
}

func (c *cost) report(b *testing.B) {
	b.ReportMetric(c.used.Seconds()*1000/float64(c.runs), "ms-cpu/op")
	if c.peak > 0 {
		b.ReportMetric(c.peak, "MiB-peak")
	}
}

var residentPeak = regexp.MustCompile(`VmHWM:\s+(\d+) kB`)

// watch asks Linux for a process's peak resident size until it ends. What wait
// tells will not do: there the peak of the process that started it counts too.
func watch(pid int, ended <-chan struct{}) (peak float64) {
	const kib = 1024
	for {
		select {
		case <-ended:
			return peak
		case <-time.After(time.Millisecond):
		}
		status, _ := os.ReadFile(fmt.Sprintf("/proc/%d/status", pid)) // gone, or another system: no match
		if m := residentPeak.FindSubmatch(status); m != nil {
			kb, _ := strconv.Atoi(string(m[1])) // digits
			peak = max(peak, float64(kb)/kib)
		}
	}
}
