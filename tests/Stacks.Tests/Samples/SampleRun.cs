using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>A sample stack before and after the host ran a recipe on it, with what is true about it.</summary>
public abstract class SampleRun : IDisposable
{
    private readonly TemporaryFolder folder = new();

    private protected SampleRun(string recipe, string stack, string impulses)
    {
        ToolResult result = Tool.Stacks("run", Truth.Path(recipe), Truth.Path(stack), "-o", folder.Path);
        Assert.True(result.ExitCode == 0, result.Output + result.Error);
        Printed = result.Output.Replace(folder.Path, "out", StringComparison.Ordinal).Replace(Checkout.Root + "/", "", StringComparison.Ordinal);
        Before = Planes(Truth.Path(stack));
        // The change mask may stand behind the frames as further planes of the file.
        After = Planes(folder.File(stack))[..Before.Count];
        Planted = Truth.Impulses(impulses);
        Struck = [.. Before.Select(_ => new HashSet<(int X, int Y)>())];
        foreach (PlantedPixel pixel in Planted)
            Struck[pixel.Frame].Add((pixel.X, pixel.Y));
    }

    /// <summary>What the host printed, as it reads when it is called in the checkout with <c>-o out</c>.</summary>
    internal string Printed { get; }

    internal List<PlainPlane> Before { get; }

    internal List<PlainPlane> After { get; }

    internal List<PlantedPixel> Planted { get; }

    /// <summary>The pixels of each frame that an impulse struck.</summary>
    internal List<HashSet<(int X, int Y)>> Struck { get; }

    public void Dispose()
    {
        folder.Dispose();
        GC.SuppressFinalize(this);
    }

    /// <summary>True when the output holds another value than the input; NaN is NaN.</summary>
    internal bool IsReplaced(int frame, int x, int y) => !Before[frame][x, y].Equals(After[frame][x, y]);

    /// <summary>The share of planted pixels that were replaced, and how many were asked about.</summary>
    internal (double Rate, int Count) Rate(Func<PlantedPixel, bool> which)
    {
        List<PlantedPixel> chosen = [.. Planted.Where(which)];
        return (chosen.Count(p => IsReplaced(p.Frame, p.X, p.Y)) / (double)chosen.Count, chosen.Count);
    }

    /// <summary>Asserts a share of replaced pixels over at least <paramref name="least"/> planted ones.</summary>
    internal void AssertRate(double atLeast, int least, Func<PlantedPixel, bool> which)
    {
        (double rate, int count) = Rate(which);
        Assert.True(count >= least, $"only {count} planted pixels");
        Assert.True(rate >= atLeast, $"{rate:P2} of {count} were replaced");
    }

    /// <summary>Replaced pixels that no impulse struck, and how many pixels no impulse struck.</summary>
    internal (List<(int Frame, int X, int Y)> Replaced, long Clean) CleanPixels()
    {
        List<(int, int, int)> replaced = [];
        long clean = 0;
        for (int frame = 0; frame < Before.Count; frame++)
        {
            for (int i = 0; i < Before[frame].Values.Length; i++)
            {
                int x = i % Before[frame].Width, y = i / Before[frame].Width;
                if (Struck[frame].Contains((x, y)))
                    continue;
                clean++;
                if (IsReplaced(frame, x, y))
                    replaced.Add((frame, x, y));
            }
        }

        return (replaced, clean);
    }

    /// <summary>True when a source's 5-px aperture lies in the frame and no impulse struck it.</summary>
    internal bool IsWholeAndClean(PlantedSource source)
    {
        PlainPlane plane = Before[source.Frame];
        return source.X >= 5 && source.X <= plane.Width - 6 && source.Y >= 5 && source.Y <= plane.Height - 6
            && Aperture(source).All(p => !Struck[source.Frame].Contains(p));
    }

    /// <summary>The pixels whose centres are within a radius of a source.</summary>
    internal static IEnumerable<(int X, int Y)> Aperture(PlantedSource source, double radius = 5) =>
        Square(source, 6).Where(p => ((p.X - source.X) * (p.X - source.X)) + ((p.Y - source.Y) * (p.Y - source.Y)) <= radius * radius);

    /// <summary>The pixel of a source's centre and its eight neighbours.</summary>
    internal static IEnumerable<(int X, int Y)> Core(PlantedSource source) => Square(source, 1);

    /// <summary>The sum over a source's aperture.</summary>
    internal static double Sum(PlainPlane plane, PlantedSource source, double radius = 5) => Aperture(source, radius).Sum(p => plane[p.X, p.Y]);

    private static IEnumerable<(int X, int Y)> Square(PlantedSource source, int half) =>
        from y in Enumerable.Range(source.Row - half, (2 * half) + 1)
        from x in Enumerable.Range(source.Column - half, (2 * half) + 1)
        select (x, y);

    private static List<PlainPlane> Planes(string path) => path.EndsWith(".tif", StringComparison.Ordinal) ? PlainTiff.Read(path) : PlainFits.Read(path);
}

/// <summary>Each sample stack is run once for all tests that ask about it.</summary>
[CollectionDefinition(Name)]
public sealed class SampleRuns : ICollectionFixture<NightFieldRun>, ICollectionFixture<SmoothNightFieldRun>,
    ICollectionFixture<WanderingCellsRun>, ICollectionFixture<FourChipsRun>
{
    public const string Name = "sample runs";
}

public sealed class NightFieldRun() : SampleRun("night-field.recipe.toml", "night-field.fits", "night-field.impulses.tsv")
{
    /// <summary>Every star where it stands in every frame.</summary>
    internal List<PlantedSource> Stars { get; } =
    [
        .. from frame in Truth.Table("night-field.frames.tsv")
           from star in Truth.Table("night-field.stars.tsv")
           select new PlantedSource(
               frame.Integer("frame"), star.Number("flux_electrons"), star.Number("x_px") + frame.Number("dx_px"), star.Number("y_px") + frame.Number("dy_px")),
    ];
}

public sealed class SmoothNightFieldRun() : SampleRun("night-field-smooth.recipe.toml", "night-field.fits", "night-field.impulses.tsv");

public sealed class WanderingCellsRun() : SampleRun("wandering-cells.recipe.toml", "wandering-cells.ome.tif", "wandering-cells.impulses.tsv");

public sealed class FourChipsRun() : SampleRun("four-chips.recipe.toml", "four-chips.fits", "four-chips.impulses.tsv");
