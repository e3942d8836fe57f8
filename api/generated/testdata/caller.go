// Calls a server with the generated client.
package main

import (
	"context"
	"fmt"
	"os"
)

func main() {
	if err := call(os.Args[1]); err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
}

func call(server string) error {
	ctx := context.Background()
	c, err := NewClientWithResponses(server)
	if err != nil {
		return err
	}
	input := LugInput{
		Units: "US", Methods: []string{"elementary"},
		Lug:       LugHead{Shape: "round"},
		Factors:   Factors{Ultimate: 1.5, Fitting: 1.15},
		LoadCases: []LugLoadCase{{Id: "LC1", Level: "limit", Force: 18000, Angle: 0}},
	}
	for length, value := range map[*Length]float64{
		&input.Lug.Width: 2, &input.Lug.Thickness: 0.5, &input.Lug.HoleDiameter: 0.75, &input.Lug.EdgeDistance: 1.125,
	} {
		if err := length.FromSize(value); err != nil {
			return err
		}
	}
	if err := input.Lug.Material.FromMaterialChoice0("7050-T7451-plate-0.250-1.500-L"); err != nil {
		return err
	}
	lug, err := c.CalculateLugWithResponse(ctx, nil, input)
	if err != nil {
		return err
	}
	if lug.JSON200 == nil {
		return fmt.Errorf("%s: %s", lug.Status(), lug.Body)
	}
	margin := lug.JSON200.ByMethod[0].Margin
	fmt.Println(lug.JSON200.Verdict, *margin)

	decision, err := c.CheckReleaseWithResponse(ctx, nil, ReleaseRequest{
		Part: "SM-2100", Revision: "B", Joints: []ReleaseJoint{{Joint: "hinge", GeometryDigest: "sha256:01"}},
	})
	if err != nil {
		return err
	}
	if decision.JSON200 == nil {
		return fmt.Errorf("%s: %s", decision.Status(), decision.Body)
	}
	fmt.Println(decision.JSON200.Decision, decision.JSON200.Findings[0].Code)

	if err := input.Lug.Thickness.FromSize(-0.5); err != nil {
		return err
	}
	refused, err := c.CalculateLugWithResponse(ctx, nil, input)
	if err != nil {
		return err
	}
	if refused.ApplicationproblemJSON422 == nil {
		return fmt.Errorf("%s: %s", refused.Status(), refused.Body)
	}
	fmt.Println(refused.StatusCode(), refused.ApplicationproblemJSON422.Errors[0].Pointer)
	return nil
}
