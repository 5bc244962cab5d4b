// Package subsume is the root of a library that answers one question about data:
// does the richer description fit better than the simpler one by more than
// chance allows, where, by how much, and can it be defended?
//
// The work is done in four packages, each importing only those before it:
//
//   - [subsume.example/dist] has the probability laws: both tails, logarithms,
//     quantiles and noncentrality;
//   - [subsume.example/lrt] compares a restricted parameter space with a full one
//     by the likelihood ratio λ, −2 log λ and the exact test where there is one;
//   - [subsume.example/glm] makes such spaces of linear models over columns of data;
//   - [subsume.example/anova] makes tables, follow-up comparisons and plans of them.
//
// README.md has the two commands to begin with and a ten-line use of each package.
package subsume

// Version is the version of the library, as it stands in audit records.
const Version = "v0.1.0"
