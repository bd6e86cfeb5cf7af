using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Inference;

/// <summary>Refits divided by index, kept as they are made, and put together again.</summary>
public class RefitPlanTests
{
    private static readonly InferenceSettings Settings = new("person", 0.95, JackknifeKind.Refit, 37, 7);

    [Theory]
    [InlineData(1)]
    [InlineData(3)]
    [InlineData(16)]
    [InlineData(50)]
    [InlineData(RefitShare.MostParts)]
    public void Shares_cover_every_index_once_in_order_and_differ_in_length_by_one_at_most(int parts)
    {
        foreach (var count in new[] { 0, 1, 37, 1_000_000 })
        {
            var shares = Enumerable.Range(1, parts).Select(p => new RefitShare(p, parts)).ToList();
            var next = 0;
            foreach (var share in shares)
            {
                Assert.Equal(next, share.First(count));
                next += share.Count(count);
            }

            Assert.Equal(count, next);
            Assert.InRange(shares.Max(s => s.Count(count)) - shares.Min(s => s.Count(count)), 0, 1);
        }
    }

    [Theory]
    [InlineData(1)]
    [InlineData(3)]
    [InlineData(60)]
    public void Shares_made_one_by_one_give_the_bits_of_a_run_that_makes_all(int parts)
    {
        var input = new LinearToy(51, 15, _ => 4).Input();
        var whole = StandardErrors.Compute(input, Settings, WorkContext.Quiet);
        var journal = new MemoryJournal();
        var plan = RefitPlan.Of(input, Settings);
        Assert.Equal(new RefitPlan(37, 15, null), plan);
        for (var part = parts; part >= 1; part--)
            plan.Make(input with { Journal = journal }, Settings, new RefitShare(part, parts), WorkContext.Quiet);
        Assert.Equal(37 + 15, journal.Kept.Count);

        var idle = new ScriptedRefitter(_ => throw new InvalidOperationException("everything is there already"));
        var joined = StandardErrors.Compute(input with { Journal = journal, Refitter = idle }, Settings, WorkContext.Quiet);
        Assert.Equal(whole.Bootstrap!.Estimates.ToArray(), joined.Bootstrap!.Estimates.ToArray());
        Assert.Equal(whole.Jackknife!.Deviations.ToArray(), joined.Jackknife!.Deviations.ToArray());
        foreach (var kind in whole.Covariances.Keys)
            Assert.Equal(whole.Covariances[kind].Matrix?.ToRowMajorArray(), joined.Covariances[kind].Matrix?.ToRowMajorArray());
    }

    [Fact]
    public void Only_what_the_journal_lacks_is_asked_for()
    {
        var input = new LinearToy(52, 15, _ => 4).Input();
        var journal = new MemoryJournal();
        var full = input with { Journal = journal };
        var plan = RefitPlan.Of(input, Settings);
        plan.Make(full, Settings, new RefitShare(1, 1), WorkContext.Quiet);
        foreach (var lost in new[] { (RefitSeries.Bootstrap, 3), (RefitSeries.Bootstrap, 36), (RefitSeries.Jackknife, 0) }) journal.Kept.Remove(lost);
        var asked = new ScriptedRefitter(r => input.Refitter.Refit([r], CancellationToken.None)[0]);
        plan.Make(full with { Refitter = asked }, Settings, new RefitShare(1, 1), WorkContext.Quiet);
        Assert.Equal(3, asked.Asked.Count);
        Assert.Equal(ClusterDraw.Weights(7, 36, 15).ToArray(), asked.Asked[1].ClusterWeight.ToArray());
        Assert.Equal(0, asked.Asked[2].ClusterWeight[0]);
    }

    [Fact]
    public void Refits_that_hold_a_lost_term_are_made_where_the_standard_errors_are()
    {
        var toy = new LinearToy(53, 15, _ => 4).Input();
        var scripted = new ScriptedRefitter(r =>
            r.ClusterWeight[2] == 0 && r.Held.IsEmpty ? ScriptedRefitter.Failed(FitStatus.NotIdentified, 1) : toy.Refitter.Refit([r], CancellationToken.None)[0]);
        var input = toy with { Refitter = scripted };
        var settings = Settings with { Replicates = 0 };
        var journal = new MemoryJournal();
        RefitPlan.Of(input, settings).Make(input with { Journal = journal }, settings, new RefitShare(1, 1), WorkContext.Quiet);
        var before = scripted.Asked.Count;
        var joined = StandardErrors.Compute(input with { Journal = journal }, settings, WorkContext.Quiet);
        Assert.Equal([1], Assert.Single(scripted.Asked.Skip(before)).Held.ToArray());
        var whole = StandardErrors.Compute(input, settings, WorkContext.Quiet);
        Assert.Equal(whole.Jackknife!.Deviations.ToArray(), joined.Jackknife!.Deviations.ToArray());
        Assert.Equal((1, 1), (whole.Jackknife.Failures, joined.Jackknife.Failures));
    }

    [Fact]
    public void A_batch_that_is_done_is_kept_when_the_next_one_is_stopped()
    {
        var input = new LinearToy(54, 15, _ => 4).Input();
        var settings = Settings with { Replicates = 2 * NumberedRefits.BatchPerThread };
        var journal = new MemoryJournal();
        using var stop = new CancellationTokenSource();
        var asked = 0;
        var refitter = new ScriptedRefitter(r =>
        {
            if (++asked == NumberedRefits.BatchPerThread + 3) stop.Cancel();
            stop.Token.ThrowIfCancellationRequested();
            return input.Refitter.Refit([r], CancellationToken.None)[0];
        });
        Assert.Throws<OperationCanceledException>(() => RefitPlan.Of(input, settings).Make(
            input with { Journal = journal, Refitter = refitter }, settings, new RefitShare(1, 1), new WorkContext(1, null, stop.Token)));
        Assert.Equal(Enumerable.Range(0, NumberedRefits.BatchPerThread).Select(r => (RefitSeries.Bootstrap, r)), journal.Kept.Keys.Order());
    }

    [Fact]
    public void A_fit_that_cannot_be_refitted_has_no_refits_and_says_why()
    {
        var input = new LinearToy(55, 15, _ => 4).Input();
        Assert.Equal(new RefitPlan(0, 0, "no maximum"), RefitPlan.Of(input with { NoMaximum = "no maximum" }, Settings));
        Assert.Equal(new RefitPlan(0, 15, null), RefitPlan.Of(input, Settings with { Replicates = 0 }));
        Assert.Equal(new RefitPlan(37, 0, null), RefitPlan.Of(input, Settings with { Jackknife = JackknifeKind.OneStep }));
        Assert.Equal(new RefitPlan(37, 0, null), RefitPlan.Of(input, Settings with { Jackknife = JackknifeKind.Off }));
    }

    private sealed class MemoryJournal : IRefitJournal
    {
        public Dictionary<(RefitSeries Series, int Number), RefitOutcome> Kept { get; } = [];

        public RefitOutcome? Find(RefitSeries series, int number) => Kept.GetValueOrDefault((series, number));

        public void Keep(RefitSeries series, ImmutableArray<int> numbers, ImmutableArray<RefitOutcome> outcomes)
        {
            for (var i = 0; i < numbers.Length; i++) Kept.Add((series, numbers[i]), outcomes[i]);
        }
    }
}
