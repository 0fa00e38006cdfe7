// Package slurmtest starts a Slurm cluster of one node on the loopback address, for
// tests: its own keys, ports and folder, nothing of the machine's own Slurm.
package slurmtest

import (
	"bytes"
	"crypto/rand"
	"fmt"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"text/template"
	"time"
)

// Start starts a cluster that ends with the test, and points the scheduler's
// commands at it. maxArray is the highest number of tasks of an array. Where Slurm
// is not installed the test is skipped; with CI set in the environment it fails.
func Start(t *testing.T, maxArray int) {
	t.Helper()
	for _, name := range []string{"munged", "slurmctld", "slurmd", "sbatch"} {
		if _, err := exec.LookPath(name); err != nil {
			if os.Getenv("CI") != "" {
				t.Fatalf("%s is not installed (Debian: slurm-wlm, munge)", name)
			}
			t.Skipf("%s is not installed (Debian: slurm-wlm, munge)", name)
		}
	}
	if os.Getuid() != 0 {
		t.Skip("a private Slurm cluster is started by root only")
	}
	dir, err := os.MkdirTemp("", "slurm") // short: the path of a socket
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = os.RemoveAll(dir) })
	for _, d := range []string{"state", "spool", "munge", "log"} {
		if err := os.Mkdir(filepath.Join(dir, d), 0o700); err != nil {
			t.Fatal(err)
		}
	}
	secret := make([]byte, 1024)
	_, _ = rand.Read(secret)
	write(t, filepath.Join(dir, "munge", "key"), secret, 0o400)
	host, err := exec.Command("hostname", "-s").Output()
	if err != nil {
		t.Fatal(err)
	}
	var conf bytes.Buffer
	err = configuration.Execute(&conf, map[string]any{"Dir": dir, "Host": strings.TrimSpace(string(host)), "Array": maxArray + 1, "Controller": port(t), "Node": port(t)})
	if err != nil {
		t.Fatal(err)
	}
	write(t, filepath.Join(dir, "slurm.conf"), conf.Bytes(), 0o644)
	t.Setenv("SLURM_CONF", filepath.Join(dir, "slurm.conf"))
	in := func(name string) string { return filepath.Join(dir, name) }
	start(t, "munged", "--foreground", "--force", "--key-file="+in("munge/key"), "--socket="+in("munge/socket"), "--pid-file="+in("munge/pid"),
		"--log-file="+in("log/munge"), "--seed-file="+in("munge/seed"))
	await(t, "munge", func() error { _, err := os.Stat(in("munge/socket")); return err })
	start(t, "slurmctld", "-D", "-i")
	await(t, "the controller", func() error { return exec.Command("scontrol", "ping").Run() })
	start(t, "slurmd", "-D")
	await(t, "the node", func() error {
		out, err := exec.Command("sinfo", "--noheader", "--format=%T").Output()
		if err == nil && strings.TrimSpace(string(out)) != "idle" {
			err = fmt.Errorf("it is %s", strings.TrimSpace(string(out)))
		}
		return err
	})
}

func write(t *testing.T, path string, data []byte, mode os.FileMode) {
	t.Helper()
	if err := os.WriteFile(path, data, mode); err != nil {
		t.Fatal(err)
	}
}

// port returns a port that is free now.
func port(t *testing.T) int {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = l.Close() }()
	return l.Addr().(*net.TCPAddr).Port
}

// start starts a daemon that is stopped, by its process number, when the test ends.
func start(t *testing.T, name string, args ...string) {
	t.Helper()
	cmd := exec.Command(name, args...)
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		_ = cmd.Process.Signal(syscall.SIGTERM)
		ended := make(chan struct{})
		go func() { _ = cmd.Wait(); close(ended) }()
		select {
		case <-ended:
		case <-time.After(10 * time.Second):
			_ = cmd.Process.Kill()
			<-ended
		}
	})
}

func await(t *testing.T, what string, ready func() error) {
	t.Helper()
	var err error
	for range 300 {
		if err = ready(); err == nil {
			return
		}
		time.Sleep(100 * time.Millisecond)
	}
	t.Fatalf("%s does not start: %v", what, err)
}

var configuration = template.Must(template.New("slurm.conf").Parse(`ClusterName=test
SlurmctldHost={{.Host}}(127.0.0.1)
SlurmctldPort={{.Controller}}
SlurmdPort={{.Node}}
SlurmUser=root
SlurmdUser=root
AuthType=auth/munge
AuthInfo=socket={{.Dir}}/munge/socket
StateSaveLocation={{.Dir}}/state
SlurmdSpoolDir={{.Dir}}/spool
SlurmctldPidFile={{.Dir}}/controller.pid
SlurmdPidFile={{.Dir}}/node.pid
SlurmctldLogFile={{.Dir}}/log/controller
SlurmdLogFile={{.Dir}}/log/node
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
SelectType=select/cons_tres
SelectTypeParameters=CR_CPU
MpiDefault=none
SwitchType=switch/none
ReturnToService=2
MaxArraySize={{.Array}}
SchedulerParameters=sched_interval=2,batch_sched_delay=0
MinJobAge=300
AccountingStorageType=accounting_storage/none
JobAcctGatherType=jobacct_gather/none
NodeName={{.Host}} NodeAddr=127.0.0.1 CPUs=2 State=UNKNOWN
PartitionName=main Nodes={{.Host}} Default=YES MaxTime=INFINITE State=UP
`))
