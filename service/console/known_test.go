package console

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// The page's own judgement of what it still knows, by clocks that the test
// moves: the one that never goes back, and the wall clock. It runs where there
// is a program that runs scripts.
const knowing = `
import { Known, limit } from "./known.js";
let fast = 1000, wall = Date.parse("2031-02-15T04:00:00Z");
performance.now = () => fast;
Date.now = () => wall;
const pass = (ms) => { fast += ms; wall += ms; };
const view = (more) => ({ at: new Date(wall).toISOString(), simulated: false, ...more });
const want = (ok, what) => { if (!ok) { console.log("not so: " + what); process.exitCode = 1; } };

let k = new Known();
want(k.lost(), "lost before the first view");
want(k.take(view(), 20) && !k.lost(), "known after a view");
pass(limit); want(!k.lost(), "known up to the limit");
pass(1); want(k.lost(), "lost past the limit");
want(k.take(view(), 20) && !k.lost(), "known again");
fast += limit + 1; want(k.lost(), "lost when only the steady clock went on");
k = new Known(); k.take(view(), 20);
wall += limit + 1; want(k.lost(), "lost when only the wall clock went on, as in a sleep");
k = new Known(); k.take(view(), 20);
wall -= 3600_000; want(!k.lost(), "a wall clock set back renews nothing and takes nothing");
pass(limit + 1); want(k.lost(), "and does not lengthen the limit");

k = new Known();
want(!k.take(view(), limit + 1) && k.lost(), "a first view that was long on its way is not believed");
k = new Known(); k.take(view(), 20);
const old = view(); pass(5000);
want(!k.take(old, 5020) && k.lost(), "a view that waited on its way is not believed");
k = new Known(); k.take(view(), 20);
const slow = view(); pass(1000);
want(k.take(slow, 1020) && !k.lost(), "a view that is a second late is believed");
pass(limit - 999); want(k.lost(), "and its second counts");
k = new Known(); k.take(view({ simulated: true }), 20); const was = view({ simulated: true }); pass(5000);
want(k.take(was, 5020) && !k.lost(), "a simulated clock keeps no pace");
k = new Known();
want(!k.take({ at: "never" }, 20) && k.lost(), "a view without a time is not believed");
k = new Known(); k.take(view(), 20); k.drop(); want(k.lost(), "lost when it is dropped");
`

func TestWhatThePageStillKnows(t *testing.T) {
	node, err := exec.LookPath("node")
	if err != nil {
		t.Skip("no program that runs scripts is installed: install nodejs to run this test")
	}
	// Of the files in a folder of its own no older program doubts that they are modules.
	dir := t.TempDir()
	for name, body := range map[string]string{"known.mjs": files(t)["known.js"], "test.mjs": strings.Replace(knowing, "./known.js", "./known.mjs", 1)} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(body), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	c := exec.Command(node, filepath.Join(dir, "test.mjs"))
	if out, err := c.CombinedOutput(); err != nil || len(out) > 0 {
		t.Errorf("%v\n%s", err, out)
	}
}
