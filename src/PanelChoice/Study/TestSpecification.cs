using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>A test of terms as the user wrote it: all of them at given values, or all equal to each other.</summary>
/// <param name="Name">Name of the test.</param>
/// <param name="Terms">What is tested.</param>
/// <param name="Values">One value for each coefficient in the order of <paramref name="Terms"/>; empty for no effect: 0 for coefficients, the limit for nests.</param>
/// <param name="Equal">Equal to each other instead.</param>
/// <param name="Line">Line of the study file.</param>
public sealed record TestSpecification(string Name, ImmutableArray<TestedTerm> Terms, ImmutableArray<double> Values, bool Equal, int Line);

/// <summary>An entry of a test.</summary>
/// <param name="Label">A term with all its coefficients, "term: alternative" for one of them, or a nest.</param>
/// <param name="Line">Line of the study file.</param>
/// <param name="Position">Position in that line.</param>
public sealed record TestedTerm(string Label, int Line, int Position);
