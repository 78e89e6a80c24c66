package main

import (
	"os"
	"os/exec"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// alone says that this process is the one in a network of its own.
const alone = "BUDGETCHECK_ALONE"

// TestAct runs action.yml for real, by a runner that speaks the host's language,
// against the host on loopback. It starts itself again in a network with nothing
// but loopback, so that the build and the action can reach nobody else.
func TestAct(t *testing.T) {
	if testing.Short() {
		t.Skip("it builds the program anew and runs it under act")
	}
	if os.Getenv(alone) == "" && canBeAlone() {
		self, err := os.Executable()
		require.NoError(t, err)
		again := exec.Command("unshare", isolated(self, "-test.run=^TestAct$", "-test.v", "-test.timeout=20m")...)
		again.Env = append(os.Environ(), alone+"=1")
		out, err := again.CombinedOutput()
		require.NoError(t, err, "%s", out)
		require.Contains(t, string(out), "--- PASS: TestAct/workflow_run", "the tests ran there")
		return
	}
	for event, run := range map[string]func(*testing.T, *runner){
		"pull_request": actPull, "push": actPush, "schedule": actSchedule, "workflow_run": actRun,
	} {
		t.Run(event, func(t *testing.T) { run(t, newRunner(t)) })
	}
}

// isolated are the arguments of unshare for a command with only loopback.
func isolated(command ...string) []string {
	args := []string{"-n", "sh", "-c", `ip link set lo up && exec "$@"`, "sh"}
	if os.Getuid() != 0 {
		args[0] = "-rn"
	}
	return append(args, command...)
}

func canBeAlone() bool { return exec.Command("unshare", isolated("true")...).Run() == nil }

func actPull(t *testing.T, r *runner) {
	o := r.act(r.pull(heavy(t, r.head)))
	require.False(t, o.passed, "%s", o.log)
	assert.Contains(t, o.log, "seen closed 200 **Gate", "later steps see the outputs")
	assert.Equal(t, []string{"closed", "200"}, []string{o.outputs["gate"], o.outputs["total-g"]})
	assert.Contains(t, o.summary, "one training")
	r.posted(o, r.head, "failure")
	require.Len(t, r.api.Comments(7), 1)
	assert.Contains(t, r.api.Comments(7)[0].Body, "Gate closed")
}

// posted asks for one check on a commit.
func (r *runner) posted(o seen, commit, conclusion string) {
	r.t.Helper()
	require.Len(r.t, r.api.CheckRuns(), 1, "%s", o.log)
	assert.Equal(r.t, []string{commit, conclusion}, []string{r.api.CheckRuns()[0].HeadSHA, r.api.CheckRuns()[0].Conclusion})
}

// actPush is on a host whose token may write no checks.
func actPush(t *testing.T, r *runner) {
	s, tip := r.pushed(lean)
	r.host().Refuse("", "check-runs")
	o := r.act(s)
	require.True(t, o.passed, "%s", o.log)
	assert.Equal(t, "open", o.outputs["gate"])
	require.Len(t, r.api.Statuses(), 1, "%s", o.log)
	assert.Equal(t, []string{tip, "success"}, []string{r.api.Statuses()[0].SHA, r.api.Statuses()[0].State})
}

func actSchedule(t *testing.T, r *runner) {
	o := r.act(r.event("schedule", map[string]any{"schedule": "15 2 * * *"}, heavy(t, r.base)))
	require.False(t, o.passed, "%s", o.log)
	assert.Equal(t, "closed", o.outputs["gate"])
	r.posted(o, r.base, "failure")
	assert.Empty(t, r.api.Comments(7))
}

func actRun(t *testing.T, r *runner) {
	o := r.act(r.reported(home, lean(t, r.head)))
	require.True(t, o.passed, "%s", o.log)
	assert.Equal(t, "open", o.outputs["gate"])
	r.posted(o, r.head, "success")
	assert.Len(t, r.api.Comments(7), 1)
}
