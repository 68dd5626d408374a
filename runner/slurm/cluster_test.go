package slurm_test

import (
	"crypto/rand"
	"net"
	"os"
	"os/exec"
	"os/user"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// A cluster is a Slurm of two nodes, n1 and n2, on this machine.
type cluster struct {
	t    *testing.T
	dir  string
	conf string // the configuration
	node map[string]*exec.Cmd
}

// startCluster starts a cluster, which stops with the test. The test is skipped
// where Slurm is not installed, unless nothing may be skipped.
func startCluster(t *testing.T) *cluster {
	for _, name := range []string{"munged", "slurmctld", "slurmd", "sbatch", "squeue"} {
		if _, err := exec.LookPath(sbin(name)); err != nil {
			if os.Getenv("RIMLIGHT_REQUIRE") != "" {
				t.Fatalf("%s is missing: install Debian's slurm-wlm and munge", name)
			}
			t.Skipf("%s is not installed", name)
		}
	}
	dir, err := os.MkdirTemp("", "rimlight-slurm-") // short, as there is a socket in it
	if err != nil {
		t.Fatal(err)
	}
	c := &cluster{t: t, dir: dir, conf: filepath.Join(dir, "slurm.conf"), node: map[string]*exec.Cmd{}}
	t.Cleanup(func() { os.RemoveAll(dir) })
	me, err := user.Current()
	if err != nil {
		t.Fatal(err)
	}
	template, err := os.ReadFile("../../testdata/slurm/slurm.conf")
	if err != nil {
		t.Fatal(err)
	}
	ports := freePorts(t, 3)
	text := strings.NewReplacer("DIR", dir, "USER", me.Username, "PORT0", ports[0], "PORT1", ports[1], "PORT2", ports[2]).Replace(string(template))
	key := make([]byte, 1024)
	rand.Read(key)
	for name, data := range map[string][]byte{"slurm.conf": []byte(text), "munge.key": key} {
		if err := os.WriteFile(filepath.Join(dir, name), data, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	os.Chmod(c.conf, 0o644)
	os.Chmod(dir, 0o755)
	os.Mkdir(filepath.Join(dir, "state"), 0o755)
	in := func(name string) string { return filepath.Join(dir, name) }
	c.daemon("munged", "--foreground", "--force", "--key-file="+in("munge.key"), "--socket="+in("munge.socket"), "--pid-file="+in("munged.pid"),
		"--log-file="+in("munged.log"), "--seed-file="+in("munge.seed"))
	c.await("munged", func() bool { _, err := os.Stat(in("munge.socket")); return err == nil })
	t.Setenv("SLURM_CONF", c.conf)
	c.daemon("slurmctld", "-D")
	c.await("slurmctld", func() bool { return strings.Contains(c.ask("scontrol", "ping"), "UP") })
	c.startNode("n1")
	c.startNode("n2")
	t.Cleanup(func() {
		c.ask("scancel", "--user="+me.Username)
		c.await("the end of jobs", func() bool { return c.ask("squeue", "--noheader") == "" })
	})
	return c
}

func sbin(name string) string {
	for _, dir := range []string{"/usr/sbin", "/usr/local/sbin"} {
		if _, err := os.Stat(filepath.Join(dir, name)); err == nil {
			return filepath.Join(dir, name)
		}
	}
	return name
}

func freePorts(t *testing.T, n int) []string {
	var out []string
	for range n {
		l, err := net.Listen("tcp", "127.0.0.1:0")
		if err != nil {
			t.Fatal(err)
		}
		defer l.Close()
		out = append(out, strconv.Itoa(l.Addr().(*net.TCPAddr).Port))
	}
	return out
}

// daemon starts one, which dies with this process.
func (c *cluster) daemon(name string, args ...string) *exec.Cmd {
	c.t.Helper()
	d := exec.Command(sbin(name), args...)
	d.SysProcAttr = &syscall.SysProcAttr{Setpgid: true, Pdeathsig: syscall.SIGKILL}
	if err := d.Start(); err != nil {
		c.t.Fatal(err)
	}
	c.t.Cleanup(func() {
		d.Process.Signal(syscall.SIGTERM)
		time.AfterFunc(5*time.Second, func() { d.Process.Kill() })
		d.Wait()
	})
	return d
}

func (c *cluster) startNode(name string) {
	c.node[name] = c.daemon("slurmd", "-D", "-N", name)
	c.await("node "+name, func() bool { return c.ask("sinfo", "--noheader", "--nodes="+name, "--format=%T") == "idle" })
}

// ask gives what one of Slurm's commands writes.
func (c *cluster) ask(name string, args ...string) string {
	out, _ := exec.Command(name, args...).Output()
	return strings.TrimSpace(string(out))
}

func (c *cluster) await(what string, ok func() bool) {
	c.t.Helper()
	for deadline := time.Now().Add(time.Minute); !ok(); time.Sleep(50 * time.Millisecond) {
		if time.Now().After(deadline) {
			c.t.Fatalf("waited a minute for %s", what)
		}
	}
}

// kill kills a node at once: its daemon, the shepherds of its jobs, and the
// jobs, as a loss of power would. Slurm would notice by itself, but takes half a
// minute to.
func (c *cluster) kill(name string, jobs []int) {
	c.node[name].Process.Kill()
	c.node[name].Wait()
	for _, pid := range jobs {
		if shepherd := parentOf(pid); shepherd > 1 {
			syscall.Kill(shepherd, syscall.SIGKILL)
		}
		syscall.Kill(pid, syscall.SIGKILL)
	}
	c.ask("scontrol", "update", "NodeName="+name, "State=DOWN", "Reason=power")
}

// parentOf is the parent of a process, 0 if that is gone.
func parentOf(pid int) int {
	stat, err := os.ReadFile("/proc/" + strconv.Itoa(pid) + "/stat")
	if err != nil {
		return 0
	}
	_, rest, _ := strings.Cut(string(stat), ") ")
	f := strings.Fields(rest)
	if len(f) < 2 {
		return 0
	}
	n, _ := strconv.Atoi(f[1])
	return n
}
