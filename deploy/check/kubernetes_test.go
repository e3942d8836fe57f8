package check

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	apps "k8s.io/api/apps/v1"
	autoscaling "k8s.io/api/autoscaling/v2"
	batch "k8s.io/api/batch/v1"
	core "k8s.io/api/core/v1"
	networking "k8s.io/api/networking/v1"
	policy "k8s.io/api/policy/v1"
	"sigs.k8s.io/yaml"
)

// cluster is what the files make.
type cluster struct {
	account    core.ServiceAccount
	service    core.Service
	deployment apps.Deployment
	job        batch.Job
	budget     policy.PodDisruptionBudget
	scaler     autoscaling.HorizontalPodAutoscaler
	network    map[string]networking.NetworkPolicy
}

// load decodes every document strictly into the types of the Kubernetes API: a
// field that is unknown or twice there fails.
func load(t *testing.T) cluster {
	t.Helper()
	c := cluster{network: map[string]networking.NetworkPolicy{}}
	files, err := filepath.Glob("../kubernetes/*.yaml")
	if err != nil || len(files) == 0 {
		t.Fatal(files, err)
	}
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		for _, document := range strings.Split(string(text), "\n---\n") {
			var head struct{ APIVersion, Kind string }
			if err := yaml.Unmarshal([]byte(document), &head); err != nil {
				t.Fatal(file, err)
			}
			var rules networking.NetworkPolicy
			into, ok := map[string]any{
				"v1 ServiceAccount":                      &c.account,
				"v1 Service":                             &c.service,
				"apps/v1 Deployment":                     &c.deployment,
				"batch/v1 Job":                           &c.job,
				"policy/v1 PodDisruptionBudget":          &c.budget,
				"autoscaling/v2 HorizontalPodAutoscaler": &c.scaler,
				"networking.k8s.io/v1 NetworkPolicy":     &rules,
			}[head.APIVersion+" "+head.Kind]
			if !ok {
				t.Errorf("%s: nothing here knows %s %s", file, head.APIVersion, head.Kind)
				continue
			}
			if err := yaml.UnmarshalStrict([]byte(document), into); err != nil {
				t.Errorf("%s: %v", file, err)
			}
			if rules.Name != "" {
				c.network[rules.Name] = rules
			}
		}
	}
	return c
}

func TestKubernetes(t *testing.T) {
	c := load(t)
	pods := c.deployment.Spec.Template
	if n := c.deployment.Spec.Replicas; n == nil || *n != 3 {
		t.Error("the Deployment has not three replicas")
	}
	confined(t, "Deployment", pods.Spec)
	confined(t, "Job", c.job.Spec.Template.Spec)

	// Everything means the same pods.
	labels := pods.Labels
	for name, selector := range map[string]map[string]string{
		"Deployment": c.deployment.Spec.Selector.MatchLabels, "Service": c.service.Spec.Selector,
		"PodDisruptionBudget": c.budget.Spec.Selector.MatchLabels, "NetworkPolicy": c.network["jointledger"].Spec.PodSelector.MatchLabels,
	} {
		if len(selector) == 0 {
			t.Errorf("%s selects everything", name)
		}
		for key, value := range selector {
			if labels[key] != value {
				t.Errorf("%s selects %s=%s, which the pods do not have", name, key, value)
			}
		}
	}
	for key, value := range c.network["jointledger-migrate"].Spec.PodSelector.MatchLabels {
		if c.job.Spec.Template.Labels[key] != value {
			t.Error("no network policy holds for the Job")
		}
	}
	if c.job.Spec.Template.Labels["app"] == labels["app"] {
		t.Error("the Service sends requests to the Job")
	}
	if to := c.scaler.Spec.ScaleTargetRef; to.Kind != "Deployment" || to.Name != c.deployment.Name || to.APIVersion != "apps/v1" {
		t.Errorf("the autoscaler scales %s %s", to.Kind, to.Name)
	}
	if least := c.scaler.Spec.MinReplicas; least == nil || int(*least) <= c.budget.Spec.MinAvailable.IntValue() {
		t.Error("the budget forbids every eviction at the fewest replicas")
	}

	server := pods.Spec.Containers[0]
	if server.Resources.Requests.Cpu().IsZero() {
		t.Error("the autoscaler has no request of processors to compare with")
	}
	port := server.Ports[0]
	if port.Name != c.service.Spec.Ports[0].TargetPort.StrVal || port.ContainerPort != c.network["jointledger"].Spec.Ingress[0].Ports[0].Port.IntVal {
		t.Error("the Service or the network policy means another port")
	}
	for name, p := range map[string]*core.Probe{"/healthz": server.LivenessProbe, "/readyz": server.ReadinessProbe} {
		if p == nil || p.HTTPGet == nil || p.HTTPGet.Path != name || p.HTTPGet.Port.StrVal != port.Name {
			t.Errorf("no probe asks %s", name)
		}
	}

	// The pod is unready before the server stops, and lives through its drain.
	notice, err := time.ParseDuration(variable(server, "JOINTLEDGER_DRAIN_NOTICE"))
	if err != nil {
		t.Fatal(err)
	}
	probe := server.ReadinessProbe
	if seen := time.Duration(probe.PeriodSeconds*probe.FailureThreshold) * time.Second; notice < seen {
		t.Errorf("the notice of %s is shorter than the %s that the probe takes", notice, seen)
	}
	const drain = 25 * time.Second
	if grace := time.Duration(*pods.Spec.TerminationGracePeriodSeconds) * time.Second; grace < notice+drain {
		t.Errorf("the pod is killed after %s, before its drain ends", grace)
	}
	if unavailable := c.deployment.Spec.Strategy.RollingUpdate.MaxUnavailable; unavailable.IntValue() != 0 {
		t.Error("an upgrade takes servers away before new ones are ready")
	}
}

// confined looks for what a pod should not be able to do.
func confined(t *testing.T, name string, spec core.PodSpec) {
	t.Helper()
	is := func(b *bool) bool { return b != nil && *b }
	of := spec.SecurityContext
	if of == nil || !is(of.RunAsNonRoot) || of.RunAsUser == nil || *of.RunAsUser == 0 || of.SeccompProfile == nil || of.SeccompProfile.Type != core.SeccompProfileTypeRuntimeDefault {
		t.Errorf("%s: the pod may be root, or call what it likes", name)
	}
	if spec.AutomountServiceAccountToken == nil || *spec.AutomountServiceAccountToken {
		t.Errorf("%s: the pod has a token for the cluster", name)
	}
	for _, c := range spec.Containers {
		plainImage(t, name, c.Image)
		s := c.SecurityContext
		if s == nil || !is(s.ReadOnlyRootFilesystem) || s.AllowPrivilegeEscalation == nil || *s.AllowPrivilegeEscalation ||
			s.Capabilities == nil || len(s.Capabilities.Drop) != 1 || s.Capabilities.Drop[0] != "ALL" || len(s.Capabilities.Add) > 0 {
			t.Errorf("%s: the container may write its root file system, gain privileges or has capabilities", name)
		}
		if c.Resources.Limits.Memory().IsZero() {
			t.Errorf("%s: the container has no limit of memory", name)
		}
		for _, e := range c.Env {
			known(t, name, e.Name)
			if e.ValueFrom != nil || strings.Contains(e.Value, "://") {
				t.Errorf("%s: %s is no file; secrets come by file", name, e.Name)
			}
			for _, path := range []string{strings.TrimPrefix(e.Value, "@")} {
				if strings.HasPrefix(path, "/") && !mounted(spec, c, path) {
					t.Errorf("%s: %s names %s, where no secret is mounted", name, e.Name, path)
				}
			}
		}
	}
}

// mounted reports whether a path lies in a secret that a container mounts.
func mounted(spec core.PodSpec, c core.Container, path string) bool {
	for _, m := range c.VolumeMounts {
		for _, v := range spec.Volumes {
			if v.Name == m.Name && v.Secret != nil && m.ReadOnly && filepath.Dir(path) == m.MountPath {
				return true
			}
		}
	}
	return false
}

func variable(c core.Container, name string) string {
	for _, e := range c.Env {
		if e.Name == name {
			return e.Value
		}
	}
	return ""
}
