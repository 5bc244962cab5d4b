package spacetest_test

import (
	"fmt"

	"subsume.example/lrt"
	"subsume.example/lrt/spacetest"
)

// printer shows what a *testing.T would be told.
type printer struct{}

func (printer) Helper()                   {}
func (printer) Errorf(f string, a ...any) { fmt.Printf("fault: "+f+"\n", a...) }
func (printer) Logf(string, ...any)       {}

// wrapper embeds a Space, and so lends its two methods and nothing more.
type wrapper struct{ lrt.Space }

// Inside a test of your own, pass its *testing.T.
func ExampleCheck() {
	full, err := lrt.PoissonRates(lrt.Exposure{Events: []float64{3, 9}, Time: []float64{1, 2}})
	if err != nil {
		fmt.Println(err)
		return
	}
	equal, err := full.Restrict(lrt.Equate("rate[1]", "rate[2]"))
	if err != nil {
		fmt.Println(err)
		return
	}
	spacetest.Check(printer{}, equal, full)
	fmt.Println("a wrapper loses", lrt.Lost(wrapper{full}))
	// Output:
	// a wrapper loses [PairFitter Restrictable Nester Improver ExactReferrer Simulator Companion Pivot BartlettCorrector]
}
