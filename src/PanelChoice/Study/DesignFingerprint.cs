using System.Globalization;
using System.Security.Cryptography;
using System.Text;

namespace PanelChoice.Study;

/// <summary>
/// A hash of everything in a study that a design depends on: the panel's columns, history rule, nests, terms, form and cluster. Title, seeds, numbers of
/// starts and replicates, tests and the place of a line in the file are not in it.
/// </summary>
internal static class DesignFingerprint
{
    /// <summary>Lower-case hexadecimal SHA-256.</summary>
    public static string Of(StudySpecification study)
    {
        var text = new StringBuilder();
        var panel = study.Panel;
        Add("panel", panel.File, panel.Person, panel.Occasion, panel.Alternative, panel.Chosen, panel.Offered, panel.Weight);
        var history = study.History;
        Add("history", history.Previous, history.LongestGap, history.WithoutHistory);
        Add("holidays", [.. history.Holidays.IsDefault ? [] : history.Holidays.Select(d => (object)d.DayNumber)]);
        foreach (var nest in study.Nests)
        {
            Add("nest", nest.Name, nest.Dissimilarity, nest.SameAs);
            Add("members", [.. nest.Members]);
        }

        foreach (var term in study.Terms)
        {
            Add("term", term.Name, term.Each, term.Base, term.Times, term.Log, term.Scale, term.Fixed, term.Start);
            Add("alternatives", [.. term.Alternatives.IsDefault ? [] : term.Alternatives]);
            Add("source", SourceOf(term.Source));
        }

        Add("model", study.Estimate.Form, study.Inference.Cluster);
        if (SecondGrouping.Of(study) is { Column: { } column }) Add("second cluster", column);
        return Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(text.ToString())));

        // Lengths before texts keep two lists apart that would read the same when joined.
        void Add(string what, params object?[] values)
        {
            text.Append(what).Append(' ').Append(values.Length);
            foreach (var value in values)
            {
                var written = value is null ? "" : Convert.ToString(value, CultureInfo.InvariantCulture)!;
                text.Append(' ').Append(value is null ? -1 : written.Length).Append(':').Append(written);
            }

            text.Append('\n');
        }
    }

    private static object?[] SourceOf(TermSource source) => source switch
    {
        ColumnSource s => ["column", s.Column, s.Is, s.Levels, s.Omit, .. MomentOf(s.Moment)],
        ConstantSource => ["constant"],
        LastChoiceSource s => ["last_choice", s.Back],
        LastNestSource s => ["last_nest", s.Back],
        StockSource s => ["stock", s.Retention],
        PastShareSource => ["past_share"],
        FirstChoiceSource => ["first_choice"],
        var other => throw new ArgumentException($"A source of the kind {other.GetType().Name} has no fingerprint.", nameof(source)),
    };

    private static object?[] MomentOf(ColumnMoment moment) => moment switch
    {
        Now => ["now"],
        Lag m => ["lag", m.Back],
        Lead m => ["lead", m.Ahead],
        Change m => ["change", m.Back],
        PersonMean => ["person_mean"],
        ChosenThen m => ["chosen_then", m.Back],
        var other => throw new ArgumentException($"A moment of the kind {other.GetType().Name} has no fingerprint.", nameof(moment)),
    };
}
