// Command heavyspot watches the once-per-turn vibration of one machine, says from
// minute to minute whether it is unbalance and of which kind, and tells the
// control room. It is an advisory monitor, no machine protection.
package main

import "os"

func main() {
	os.Exit(execute(os.Args[1:], os.Stdout, os.Stderr))
}
