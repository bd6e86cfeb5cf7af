using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Panels;

namespace PanelChoice.Results;

/// <summary>Covariates as rows and columns: which used occasion and alternative a row stands for, and what a column says there.</summary>
internal sealed class CovariateTable
{
    private readonly CovariateSet set;
    private readonly int[] usedOf;
    private readonly int[] alternativeOf;
    private readonly int[] placeOf;

    public CovariateTable(CovariateSet set)
    {
        this.set = set;
        var alternatives = Panel.Alternatives.Length;
        var used = new List<int>(set.Used.Length * alternatives);
        var alternative = new List<int>(set.Used.Length * alternatives);
        for (var t = 0; t < set.Used.Length; t++)
            for (var j = 0; j < alternatives; j++)
            {
                if (Panel.Row[(set.Used[t] * alternatives) + j] < 0) continue;
                used.Add(t);
                alternative.Add(j);
            }

        usedOf = [.. used];
        alternativeOf = [.. alternative];
        placeOf = [.. set.Covariates.SelectMany(c => Enumerable.Range(0, alternatives).Select(j => c.Enters.IndexOf(j)))];
        Columns = ColumnNames.Distinct(set.Covariates.Select(c => c.Label), KeyNames);
    }

    /// <summary>Names of the columns before the covariates.</summary>
    public static ImmutableArray<string> KeyNames { get; } = ["person", "occasion", "alternative", "chosen", "offered"];

    public ChoicePanel Panel => set.Panel;

    /// <summary>Number of rows.</summary>
    public int Rows => usedOf.Length;

    /// <summary>Names of the covariates' columns.</summary>
    public ImmutableArray<string> Columns { get; }

    public string Person(int row) => Panel.Persons[Panel.PersonOf[OccasionIndex(row)]];

    /// <summary>Whole number or day number of the row's occasion.</summary>
    public long Occasion(int row) => Panel.Occasion[OccasionIndex(row)];

    public string Alternative(int row) => Panel.Alternatives[alternativeOf[row]];

    public bool IsChosen(int row) => Panel.Chosen[OccasionIndex(row)] == alternativeOf[row];

    public bool IsOffered(int row) => Panel.Offered[(OccasionIndex(row) * Panel.Alternatives.Length) + alternativeOf[row]];

    /// <summary>The covariate of a column.</summary>
    public double Value(int row, int column)
    {
        var covariate = set.Covariates[column];
        var place = placeOf[(column * Panel.Alternatives.Length) + alternativeOf[row]];
        if (place < 0) return 0;
        return covariate.IsConstant ? (IsOffered(row) ? 1 : 0) : covariate.Values[(usedOf[row] * covariate.Enters.Length) + place];
    }

    private int OccasionIndex(int row) => set.Used[usedOf[row]];
}
