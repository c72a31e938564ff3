package draft

import (
	"bytes"
	"fmt"
	"math"
	"slices"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
)

// Methods writes methods.md: how the numbers were found, in two paragraphs to
// adapt, and the references that they name.
func Methods(r *gather.Run) []byte {
	var b bytes.Buffer
	b.WriteString("<!-- Two paragraphs to adapt. Check every name and add the references of the data. -->\n\n")
	if !r.Summary.Complete {
		b.WriteString("**UNFINISHED: the run stopped before its goal.**\n\n")
	}
	fmt.Fprintf(&b, "%s\n\n%s\n\n", modelling(r), sampling(r))
	b.WriteString("References: Goodman & Weare 2010, Commun. Appl. Math. Comput. Sci. 5, 65 (stretch move); " +
		"ter Braak 2006, Stat. Comput. 16, 239 (differential evolution); " +
		"Vehtari et al. 2021, Bayesian Anal. 16, 667 (R-hat)")
	if r.Job.Space.Family().DarkEnergy == likelihood.Constant {
		b.WriteString("; Carroll, Press & Turner 1992, ARA&A 30, 499, and Felten & Isaacman 1986, RMP 58, 689 (fates)")
	}
	if bridged(r.Summary) {
		b.WriteString("; Meng & Wong 1996, Stat. Sinica 6, 831 (bridge sampling)")
	}
	b.WriteString(".\n")
	if len(r.Summary.Warnings) > 0 {
		b.WriteString("\nNot for the paper, but before it is sent:\n\n")
		for _, w := range r.Summary.Warnings {
			fmt.Fprintf(&b, "- %s\n", markdown(w))
		}
	}
	return b.Bytes()
}

// modelling is the paragraph on data, model, likelihood and priors.
func modelling(r *gather.Run) string {
	var data, likes []string
	for i := range r.Job.Tables {
		data = append(data, table(&r.Job.Tables[i]))
		if s := offset(r, i); s != "" {
			likes = append(likes, s)
		}
	}
	f := r.Job.Space.Family()
	s := fmt.Sprintf("We fit %s to %s: %s. ", universe(f), digits.Count(r.Summary.Fit.Rows, "measurement"), strings.Join(data, "; "))
	s += "The likelihood of each table is Gaussian in the measured quantities; covariances are used in full, by their Cholesky factors. "
	s += strings.Join(likes, "")
	s += "Priors: " + priors(f) + "."
	if f.RequireBigBang {
		s += " Universes without a big bang in their past are excluded."
	}
	if f.RequireMatterEra && f.DarkEnergy == likelihood.W0Wa {
		s += " Universes with w0 + wa ≥ 0, in which dark energy ruled early, are excluded."
	}
	return s
}

// objects is how many of what a table of some kind has.
func objects(n int, kind string) string {
	if kind == "supernovae" && n != 1 {
		return fmt.Sprintf("%d type Ia supernovae", n)
	}
	what := map[string]string{"supernovae": "type Ia supernova", "bao": "BAO distance ratio", "ages": "age of old objects", "rates": "expansion rate"}
	return digits.Count(n, what[kind])
}

// table describes one table: what, how many, at which redshifts, with what errors.
func table(t *job.Table) string {
	z := t.Z()
	n := objects(len(z), t.Spec.Kind)
	if s := t.Spec.StandsFor; s != nil && s.Rows > 0 {
		n = digits.Count(len(z), "magnitude") + " in place of " + objects(s.Rows, t.Spec.Kind)
	}
	errs := "independent errors"
	switch {
	case t.Spec.Covariance != "" && t.Spec.CovarianceHolds == "added":
		errs = "a covariance added to their own errors"
	case t.Spec.Covariance != "":
		errs = "their full covariance"
	case t.Spec.Templates != "":
		errs = fmt.Sprintf("their own errors and %s (%s), each of an amplitude with a unit normal prior, marginalised analytically",
			digits.Count(len(t.Systematics), "template of systematic errors"), code(t.Spec.Templates))
	}
	s := fmt.Sprintf("%s (%s at redshifts %.4g to %.4g, with %s", markdown(t.Name), n, slices.Min(z), slices.Max(z), errs)
	if t.Spec.Keep != "" {
		s += ", rows with " + code(t.Spec.Keep)
	}
	return s + ")"
}

// code is a text in a span of code, whatever it holds.
func code(s string) string {
	s = comment(s)
	fence := "`"
	for strings.Contains(s, fence) {
		fence += "`"
	}
	if strings.HasPrefix(s, "`") || strings.HasSuffix(s, "`") {
		s = " " + s + " "
	}
	return fence + s + fence
}

func offset(r *gather.Run, i int) string {
	t := &r.Job.Tables[i]
	if t.Supernovae == nil {
		return ""
	}
	o, err := r.Job.Run.Offset(i)
	switch {
	case err != nil || o.Kind == likelihood.AbsoluteOffset:
		return fmt.Sprintf("The distances of %s are taken as absolute. ", markdown(t.Name))
	case o.Kind == likelihood.NormalOffset:
		return fmt.Sprintf("For %s the absolute magnitude has a normal prior, %g ± %g mag, and is marginalised analytically. ", markdown(t.Name), o.Mean, o.SD)
	}
	return fmt.Sprintf("The common offset of the magnitudes of %s, in which the absolute magnitude and H0 are degenerate, is marginalised analytically over a flat prior. ", markdown(t.Name))
}

func universe(f likelihood.Family) string {
	s := "a universe of matter, curvature and "
	if f.Flat {
		s = "a flat universe of matter and "
	}
	s += map[likelihood.DarkEnergy]string{likelihood.Constant: "a cosmological constant", likelihood.W: "dark energy of constant equation of state w0",
		likelihood.W0Wa: "dark energy with w(a) = w0 + wa (1 - a)"}[f.DarkEnergy]
	switch {
	case f.FromTemperature:
		s += ", with the radiation of a CMB temperature of 2.7255 K and 3.044 massless neutrinos,"
	case f.Radiation > 0:
		s += fmt.Sprintf(", with radiation Or = %g,", f.Radiation)
	default:
		s += ", radiation neglected,"
	}
	return s
}

func priors(f likelihood.Family) string {
	var out []string
	for _, p := range f.Free {
		name := p.Name
		if u := likelihood.Unit(name); u != "" {
			name += " (" + u + ")"
		}
		out = append(out, name+" "+p.Prior.String())
	}
	for _, name := range likelihood.Names() {
		if v, ok := f.Fixed[name]; ok {
			out = append(out, fmt.Sprintf("%s fixed at %g", name, v))
		}
	}
	return strings.Join(out, "; ")
}

// sampling is the paragraph on the chain, its convergence and the software.
func sampling(r *gather.Run) string {
	m := r.Summary.Sampling
	worst := 0.0
	for _, q := range r.Summary.Parameters {
		worst = math.Max(worst, float64(q.MCSE)/float64(q.SD))
	}
	s := fmt.Sprintf("The posterior is sampled by affine-invariant moves, half of them stretches (Goodman & Weare 2010) and half differences (differential evolution, ter Braak 2006), in %d independent ensembles of %d walkers, "+
		"started over-dispersed about the best fit, for %s, of which the first %d, chosen from the chain itself, are discarded. ",
		m.Ensembles, m.Walkers, digits.Count(m.Steps, "step"), m.BurnIn)
	s += fmt.Sprintf("The rank-normalised split R-hat over the ensembles (Vehtari et al. 2021) is at most %.4f, the effective sample size of every parameter at least %.0f; "+
		"Monte Carlo errors of the means are below %s of the standard deviations. ", float64(m.MaxRHat), math.Floor(float64(m.MinESS)), percent(worst))
	if m.Ensembles == 0 {
		s = "The posterior is integrated by adaptive quadrature, without a chain. "
	}
	f := r.Summary.Fit
	s += fmt.Sprintf("The best fit, the point of highest posterior density, has chi-squared %.2f for %s. ", float64(f.Chi2), digits.Count(f.DoF, "degree of freedom"))
	s += "We quote posterior means with standard deviations, or medians with central 68% intervals where these are lopsided, and central 95% intervals. " +
		"The probability of a fate is the share of the posterior whose universes meet it" + boundaries(r.Job.Space.Family().DarkEnergy) + "; "
	s += fates(r.Summary)
	s += "Computed with omen " + markdown(r.Summary.Version)
	if m.Ensembles > 0 {
		s += fmt.Sprintf(", seed %d", m.Seed)
	}
	return s + "."
}

// boundaries says what decides the fates, and where that is an extrapolation.
func boundaries(d likelihood.DarkEnergy) string {
	switch d {
	case likelihood.W:
		return ", by the zeros of H² ahead and the growth of dark energy"
	case likelihood.W0Wa:
		return ", by the zeros of H² ahead and the growth of dark energy (for wa ≠ 0 the far future extrapolates a formula made for the past: " +
			"wa > 0 ends in a rip whatever w0, wa < 0 lets dark energy die away; we also give the fates with w held at today's value)"
	}
	return " (Carroll, Press & Turner 1992; Felten & Isaacman 1986)"
}

// percent rounds up to one digit.
func percent(x float64) string {
	if !(x > 0) {
		return "1%"
	}
	unit := math.Pow10(int(math.Floor(math.Log10(100 * x))))
	return digits.Format(math.Ceil(100*x/unit)*unit, int(math.Floor(math.Log10(unit)+0.5))) + "%"
}

// bridged tells whether an evidence comes from bridge sampling.
func bridged(s *result.Summary) bool {
	return slices.ContainsFunc(s.Nested, func(n result.Nested) bool { return n.Method == "bridge sampling" })
}

// evidences is how they were had.
func evidences(s *result.Summary) string {
	if bridged(s) {
		return ", by quadrature up to three parameters and by bridge sampling beyond or where quadrature is not to be had (Meng & Wong 1996)"
	}
	return ", by quadrature"
}

// fates is how their probabilities were found.
func fates(s *result.Summary) string {
	text := "where no sample does, the 95% upper limit is 3 over the effective sample size. "
	if len(s.Engine.Exact) > 0 {
		text = "it is integrated by adaptive quadrature"
		if s.Sampling.Ensembles > 0 {
			text += ", which also checks the chain"
		}
		if d := s.Engine.Largest; d != nil {
			text += fmt.Sprintf(" (largest difference %.2f of a posterior width)", float64(d.Widths))
		}
		text += ". "
	}
	if len(s.Nested) > 1 {
		text += fmt.Sprintf("Exactly flat, critical and empty universes have no volume in the posterior; "+
			"the %d nested universes are compared by their evidences%s, under the priors above normalised over the universes that are admitted, "+
			"with the prior odds stated beside the result. ", len(s.Nested), evidences(s))
	}
	return text
}
