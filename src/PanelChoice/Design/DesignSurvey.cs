using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Study;

namespace PanelChoice.Design;

/// <summary>What must be known of all persons before the first block of a design can be laid out, gathered part by part.</summary>
/// <param name="tree">The nest tree over the panel's alternatives.</param>
internal sealed class DesignSurvey(NestTree tree)
{
    private readonly bool[] any = new bool[tree.Alternatives.Length + tree.Nodes.Length];
    private readonly List<int> personStart = [0];
    private readonly List<double> weight = [];
    private readonly List<int> cluster = [];
    private CodingSurvey[]? codings;

    /// <summary>Situations in which each inner node has two or more offered children.</summary>
    public int[] Wide { get; } = new int[tree.Nodes.Length];

    /// <summary>First situation of each person of the sample; one more entry closes the last.</summary>
    public IReadOnlyList<int> PersonStart => personStart;

    /// <summary>Sampling weight of each of these persons.</summary>
    public IReadOnlyList<double> Weight => weight;

    /// <summary>Cluster of each of these persons, by its place among the clusters of the whole panel.</summary>
    public IReadOnlyList<int> Cluster => cluster;

    /// <summary>Number of persons of the sample up to and including each person of the panel: where blocks may end.</summary>
    public List<int> PersonsUpTo { get; } = [];

    /// <summary>Looks at the covariates of a part.</summary>
    /// <param name="covariates">The part's covariates, in the same order in every part.</param>
    /// <param name="firstCluster">Place of the part's first cluster among those of the panel: 0, or its first person where persons are the clusters.</param>
    public void Add(CovariateSet covariates, int firstCluster)
    {
        codings ??= [.. covariates.Covariates.Select(c => new CodingSurvey(c.Enters.Length))];
        for (var k = 0; k < codings.Length; k++) codings[k].Add(covariates.Covariates[k]);
        AddPersons(covariates, firstCluster);
        AddWidths(covariates);
    }

    /// <summary>Codings of a covariate's columns, one for each alternative that it enters.</summary>
    /// <param name="covariate">Its place among the covariates of each part.</param>
    public ImmutableArray<StoredColumn> CodingsOf(int covariate) => codings![covariate].Codings();

    private void AddPersons(CovariateSet covariates, int firstCluster)
    {
        var panel = covariates.Panel;
        var t = 0;
        for (var p = 0; p < panel.Persons.Length; p++)
        {
            var before = t;
            while (t < covariates.Used.Length && panel.PersonOf[covariates.Used[t]] == p) t++;
            if (t > before)
            {
                personStart.Add(checked(personStart[^1] + (t - before)));
                weight.Add(panel.Weight[p]);
                cluster.Add(firstCluster + panel.ClusterOf[p]);
            }

            PersonsUpTo.Add(weight.Count);
        }
    }

    private void AddWidths(CovariateSet covariates)
    {
        var alternatives = tree.Alternatives.Length;
        foreach (var occasion in covariates.Used)
        {
            covariates.Panel.Offered.AsSpan(occasion * alternatives, alternatives).CopyTo(any);
            for (var n = 0; n < tree.Nodes.Length; n++)
            {
                var width = 0;
                foreach (var c in tree.Nodes[n].Children) if (any[c]) width++;
                any[alternatives + n] = width > 0;
                if (width > 1) Wide[n]++;
            }
        }
    }
}
