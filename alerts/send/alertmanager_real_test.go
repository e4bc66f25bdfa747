package send

import (
	"context"
	"encoding/json"
	"fmt"
	"net"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"testing"
	"time"

	"beamward/alerts"
)

// Against Debian's prometheus-alertmanager, run as a plain process on loopback:
// an alarm that is raised stands there, and one that returned does not.
func TestRealAlertmanager(t *testing.T) {
	binary, err := exec.LookPath("prometheus-alertmanager")
	if err != nil {
		t.Skip("prometheus-alertmanager is not installed (Debian package of that name)")
	}
	dir := t.TempDir()
	config := filepath.Join(dir, "am.yml")
	if err := os.WriteFile(config, []byte("route: {receiver: none}\nreceivers: [{name: none}]\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	where := l.Addr().String()
	_ = l.Close()
	cmd := exec.Command(binary, "--config.file="+config, "--storage.path="+dir, "--web.listen-address="+where, "--cluster.listen-address=")
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	defer func() { _ = cmd.Process.Kill(); _ = cmd.Wait() }()
	a, err := NewAlertmanager(AlertmanagerOptions{URL: "http://" + where, Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	defer a.client.CloseIdleConnections()
	ctx := context.Background()
	m := message()
	m.At, m.Since = time.Now().Add(-time.Minute), time.Now().Add(-time.Minute)
	for try := 0; ; try++ {
		if err = a.Send(ctx, m); err == nil {
			break
		}
		if try == 100 {
			t.Fatal(err)
		}
		time.Sleep(100 * time.Millisecond)
	}
	standing := func() string {
		r, err := a.client.Get("http://" + where + "/api/v2/alerts?active=true")
		if err != nil {
			t.Fatal(err)
		}
		defer func() { _ = r.Body.Close() }()
		var got []struct{ Labels, Annotations map[string]string }
		if err := json.NewDecoder(r.Body).Decode(&got); err != nil || r.StatusCode != http.StatusOK {
			t.Fatal(err, r.Status)
		}
		out := ""
		for _, o := range got {
			out += fmt.Sprint(o.Labels["alertname"], " ", o.Labels["beam"], " ", o.Annotations["action"] != "", ";")
		}
		return out
	}
	if got := standing(); got != "shutter-fault north true;" {
		t.Errorf("standing: %q", got)
	}
	m.What, m.State, m.At = alerts.CameBack, alerts.Returned, time.Now().Add(-time.Second)
	if err := a.Send(ctx, m); err != nil {
		t.Fatal(err)
	}
	if got := standing(); got != "" {
		t.Errorf("standing after its return: %q", got)
	}
}
