using System.Collections.Immutable;
using FsCheck.Xunit;
using PanelChoice.Data;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

public class RowOrderTests
{
    private static readonly TermSpecification[] Terms =
    [
        Studies.Term("constant", new ConstantSource()).Each("bus"),
        Studies.Column("delay"),
        Studies.Column("delay", new Lag(1)) with { Name = "lag" },
        Studies.Column("delay", new Change(1)) with { Name = "change" },
        Studies.Column("delay", new ChosenThen(1)) with { Name = "chosen then" },
        Studies.Column("delay", new PersonMean()) with { Name = "mean" },
        Studies.Term("last", new LastChoiceSource(1)),
        Studies.Term("stock", new StockSource(0.7)),
        Studies.Term("share", new PastShareSource()),
        Studies.Term("first", new FirstChoiceSource()),
    ];

    [Property(MaxTest = 50)]
    public void The_order_of_rows_means_nothing(int seed)
    {
        var random = new CounterRandom(seed, "row order", 0);
        var lines = new List<string>();
        for (var p = 0; p < 4; p++)
            for (var t = 1; t <= 9; t++)
                if (random.NextDouble() < 0.8)
                    lines.Add($"p{p} {t} {(random.Next(2) == 0 ? "bus" : "tram")} delay={random.Next(9)},{random.Next(9)},{random.Next(9)} offered={(random.Next(3) > 0 ? "bus,ferry,tram" : "bus,tram")}");
        if (lines.Count < 12) return;
        var table = Diary.Table("bus ferry tram", string.Join('\n', lines));
        var order = Enumerable.Range(0, table.Rows).ToArray();
        random.Shuffle(order);
        var shuffled = table with
        {
            SourceRow = [.. order.Select(r => table.SourceRow[r])],
            Person = Reorder(table.Person, order),
            Occasion = [.. order.Select(r => table.Occasion[r])],
            Alternative = Reorder(table.Alternative, order),
            Chosen = [.. order.Select(r => table.Chosen[r])],
            Offered = [.. order.Select(r => table.Offered[r])],
            Numbers = table.Numbers.ToImmutableDictionary(n => n.Key, n => order.Select(r => n.Value[r]).ToImmutableArray()),
        };
        var straight = Built.Set(Diary.PanelOf(table), Studies.History(PreviousRule.Step, MissingHistory.Drop), Terms);
        var other = Built.Set(Diary.PanelOf(shuffled), Studies.History(PreviousRule.Step, MissingHistory.Drop), Terms);
        Assert.Equal(straight.Occasions(), other.Occasions());
        Assert.Equal(straight.LeftOut.AsEnumerable(), other.LeftOut);
        Assert.Equal(straight.StockStarts.AsEnumerable(), other.StockStarts);
        foreach (var (a, b) in straight.Covariates.Zip(other.Covariates))
        {
            Assert.Equal(a.Label, b.Label);
            Assert.Equal(a.Values.AsEnumerable(), b.Values);
        }
    }

    private static CodedColumn Reorder(CodedColumn column, int[] order) => column with { Codes = [.. order.Select(r => column.Codes[r])] };
}
